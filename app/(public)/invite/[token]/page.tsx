import type { Metadata } from 'next';
import Link from 'next/link';
import { AcceptForm } from '@/components/identity/AcceptForm';
import { roleWords } from '@/components/identity/roleWords';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';
import { getServices } from '@/lib/http/services';
import { readInvitation } from '@/lib/identity/readInvitation';

export const metadata: Metadata = { title: 'Invitation' };

/** What an invitation's mail leads to. */
export default async function InvitePage({ params }: { params: Promise<{ token: string }> }) {
  const services = await getServices();
  const open = await readInvitation(services, (await params).token);
  if (!open)
    return (
      <>
        <h1 className="mb-4">This invitation is not open</h1>
        <Notice tone="info">
          It was taken up, withdrawn, or its seven days are over. Ask your IT department for another one, or{' '}
          <Link href="/sign-in">sign in</Link> if you have an account.
        </Notice>
      </>
    );
  return (
    <>
      <h1 className="mb-2">Welcome, {open.name}</h1>
      <p className="mb-6 max-w-line text-17 text-ink-soft">
        You are invited as {roleWords(open.roles).toLowerCase()}. The invitation works until{' '}
        <Time at={open.expiresAt} mode="minute" withZone />.
      </p>
      <AcceptForm token={(await params).token} email={open.email} />
    </>
  );
}
