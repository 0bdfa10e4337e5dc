import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { ClipsTable } from '@/components/bedside/ClipsTable';
import { bornInWords, nameOf } from '@/components/bedside/words';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { ButtonLink } from '@/components/ui/Button';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { clipsOfEncounter } from '@/lib/filing/readClips';
import { sessionsOf } from '@/lib/filing/readEncounters';
import { requirePage } from '@/lib/http/page';
import { reachEncounter } from '@/lib/http/reach';
import { Refusal } from '@/lib/platform/errors';

export const metadata: Metadata = { title: 'Encounter' };

const STATUS: Record<string, string> = {
  planned: 'planned',
  'in-progress': 'running',
  finished: 'ended',
  cancelled: 'cancelled',
};

/** One encounter: who, where, what was heard. */
export default async function EncounterPage({ params }: { params: Promise<{ id: string }> }) {
  const { person, services } = await requirePage('bedside.read');
  const encounter = await reachEncounter(services, person, (await params).id).catch((error: unknown) => {
    if (error instanceof Refusal) notFound();
    throw error;
  });
  const [clips, sessions] = await Promise.all([
    clipsOfEncounter(services, encounter.id),
    sessionsOf(services, encounter.id),
  ]);
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'encounter', id: encounter.id }]} />
      <PageHead
        title={nameOf(encounter)}
        back={<Link href="/bedside">Bedside</Link>}
        action={
          encounter.session ? (
            <ButtonLink href={`/bedside/sessions/${encounter.session.id}`} variant="primary">
              To session {encounter.session.number}
            </ButtonLink>
          ) : encounter.status === 'in-progress' ? (
            <ButtonLink href={`/bedside/sessions/new?encounter=${encounter.id}`} variant="primary">
              Open a listening session
            </ButtonLink>
          ) : null
        }
      >
        Born {bornInWords(encounter.birthDate)}, record <span className="mono">{encounter.recordNumber}</span>
        . Encounter <span className="mono">{encounter.number}</span> is{' '}
        {STATUS[encounter.status] ?? encounter.status}, with {clips.length}{' '}
        {clips.length === 1 ? 'recording' : 'recordings'}.
      </PageHead>
      <div className="grid gap-x-8 gap-y-8 plate:grid-cols-[minmax(0,1fr)_280px]">
        <ClipsTable
          key={clips.map((clip) => clip.stage).join('') + (clips[0]?.id ?? '')}
          href={null}
          first={JSON.parse(JSON.stringify({ rows: clips }))}
          withPatient={false}
          empty={
            <EmptyState title="No recordings yet">
              Open a listening session with a stethoscope: its clips file themselves here.
            </EmptyState>
          }
        />
        <aside className="grid content-start gap-6">
          <Section title="Encounter">
            <DefinitionList
              facts={[
                { term: 'Ward', value: encounter.ward ?? 'not known' },
                { term: 'Bed', value: encounter.bed ?? 'not known' },
                { term: 'Began', value: <Time at={encounter.startedAt} mode="minute" /> },
              ]}
            />
          </Section>
          <Section title="Listening sessions">
            {sessions.length === 0 ? (
              <p className="text-ink-soft">None yet.</p>
            ) : (
              <ul className="grid gap-1.5">
                {sessions.map((session) => (
                  <li key={session.id}>
                    <Link className="link mono" href={`/bedside/sessions/${session.id}`}>
                      {session.number}
                    </Link>{' '}
                    <span className="text-ink-soft">
                      {session.assetTag}, <Time at={session.openedAt} mode="minute" />
                      {session.closedAt === null ? ', open' : ''}
                    </span>
                  </li>
                ))}
              </ul>
            )}
          </Section>
        </aside>
      </div>
    </>
  );
}
