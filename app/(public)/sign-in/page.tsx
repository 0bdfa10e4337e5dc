import type { Metadata } from 'next';
import { redirect } from 'next/navigation';
import { SignInForm } from '@/components/identity/SignInForm';
import { readVisitor } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Sign in' };

/** An address of this house, or the front door: never another site. */
const safeNext = (value: string | string[] | undefined): string =>
  typeof value === 'string' && /^\/(?![/\\])/.test(value) ? value : '/';

export default async function SignInPage({
  searchParams,
}: {
  searchParams: Promise<{ next?: string | string[] }>;
}) {
  const { person } = await readVisitor();
  const next = safeNext((await searchParams).next);
  if (person) redirect(next);
  return <SignInForm next={next} />;
}
