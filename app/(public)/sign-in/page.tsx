import type { Metadata } from 'next';
import { redirect } from 'next/navigation';
import { SignInForm, type SignInStep } from '@/components/identity/SignInForm';
import { readVisitor } from '@/lib/http/page';
import { safeNext } from '@/lib/http/safeNext';
import { passkeysPossible } from '@/lib/identity/passkeys/passkeysOf';
import { readConnection } from '@/lib/platform/connectionSetting';

export const metadata: Metadata = { title: 'Sign in' };

const NOTICES: Record<string, string> = {
  refused:
    'The hospital’s account did not sign you in here. If you were never invited, ask your IT department.',
  unreachable:
    'The hospital’s sign-on does not answer. Sign in with your password, or try again in a moment.',
};
const STEPS: Record<string, SignInStep> = { 'second-factor': 'code', passkey: 'passkey' };

export default async function SignInPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await readVisitor();
  const search = await searchParams;
  const next = safeNext(search.next, services.env.BELLKEEP_ORIGIN);
  if (person) redirect(next);
  const provider = await readConnection(services, 'single-sign-on');
  return (
    <SignInForm
      next={next}
      first={STEPS[String(search.step)] ?? 'password'}
      notice={NOTICES[String(search['sign-on'])] ?? null}
      signOn={provider?.settings.name ?? null}
      passkeys={passkeysPossible(services)}
    />
  );
}
