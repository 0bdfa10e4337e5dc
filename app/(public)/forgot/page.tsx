import type { Metadata } from 'next';
import Link from 'next/link';
import { ForgotForm } from '@/components/identity/ForgotForm';

export const metadata: Metadata = { title: 'Set a new password' };

export default function ForgotPage() {
  return (
    <>
      <h1 className="mb-4">Set a new password</h1>
      <ForgotForm />
      <p className="mt-6">
        <Link href="/sign-in" className="link">
          Back to sign in
        </Link>
      </p>
    </>
  );
}
