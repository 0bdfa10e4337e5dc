import type { Metadata } from 'next';
import { notFound } from 'next/navigation';
import { SessionView } from '@/components/bedside/SessionView';
import type { Session } from '@/components/bedside/session';
import { countBedside } from '@/lib/filing/readEncounters';
import { requirePage } from '@/lib/http/page';
import { reachSession } from '@/lib/http/reach';
import { Refusal } from '@/lib/platform/errors';

export const metadata: Metadata = { title: 'Listening session' };

/** One listening session, live. */
export default async function SessionPage({ params }: { params: Promise<{ id: string }> }) {
  const { person, services } = await requirePage('bedside.read');
  const session = await reachSession(services, person, (await params).id).catch((error: unknown) => {
    if (error instanceof Refusal) notFound();
    throw error;
  });
  const { tray } = await countBedside(services, person);
  return <SessionView first={session as unknown as Session} tray={tray} />;
}
