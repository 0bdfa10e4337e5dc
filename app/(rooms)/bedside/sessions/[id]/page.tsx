import type { Metadata } from 'next';
import { SessionView } from '@/components/bedside/SessionView';
import { countBedside } from '@/lib/filing/readEncounters';
import { orNotFound, requirePage } from '@/lib/http/page';
import { reachSession } from '@/lib/http/reach';

export const metadata: Metadata = { title: 'Listening session' };

/** One listening session, live. */
export default async function SessionPage({ params }: { params: Promise<{ id: string }> }) {
  const { person, services } = await requirePage('bedside.read');
  const session = await orNotFound(reachSession(services, person, (await params).id));
  const { tray } = await countBedside(services, person);
  return <SessionView key={session.id} first={session} tray={tray} />;
}
