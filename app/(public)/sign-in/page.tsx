import type { Metadata } from 'next';
import { redirect } from 'next/navigation';
import { SignInForm } from '@/components/identity/SignInForm';
import { readVisitor } from '@/lib/http/page';
import { safeNext } from '@/lib/http/safeNext';

export const metadata: Metadata = { title: 'Sign in' };

export default async function SignInPage({
  searchParams,
}: {
  searchParams: Promise<{ next?: string | string[] }>;
}) {
  const { person, services } = await readVisitor();
  const next = safeNext((await searchParams).next, services.env.BELLKEEP_ORIGIN);
  if (person) redirect(next);
  return <SignInForm next={next} />;
}
