import type { Metadata } from 'next';
import { NewPasswordForm } from '@/components/identity/NewPasswordForm';

export const metadata: Metadata = { title: 'Set a new password' };

export default async function ResetPage({ params }: { params: Promise<{ token: string }> }) {
  return (
    <>
      <h1 className="mb-4">Set a new password</h1>
      <NewPasswordForm token={(await params).token} />
    </>
  );
}
