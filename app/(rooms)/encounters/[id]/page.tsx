import type { Metadata } from 'next';
import Link from 'next/link';
import { ClipsTable } from '@/components/bedside/ClipsTable';
import { EncounterRefresh } from '@/components/bedside/EncounterRefresh';
import { ReasonAsked } from '@/components/bedside/ReasonForm';
import { bornInWords, counted, nameOf } from '@/components/bedside/words';
import { wordedEntry } from '@/components/custody/entryWords';
import { ButtonLink } from '@/components/ui/Button';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { readHistory } from '@/lib/custody/readHistory';
import type { EncounterLine } from '@/lib/filing/readEncounters';
import { type EncounterContents, readEncounterContents } from '@/lib/filing/readOneEncounter';
import { orNotFound, requirePage } from '@/lib/http/page';
import { reachEncounter } from '@/lib/http/reach';
import { Refusal } from '@/lib/platform/errors';

export const metadata: Metadata = { title: 'Encounter' };

const STATUS: Record<string, string> = {
  planned: 'planned',
  'in-progress': 'running',
  finished: 'over',
  cancelled: 'cancelled',
};

/** One encounter: who, where, what was heard, what happened. */
export default async function EncounterPage({ params }: { params: Promise<{ id: string }> }) {
  const { person, services } = await requirePage('bedside.read');
  const { id } = await params;
  const encounter = await orNotFound(
    reachEncounter(services, person, id).catch((error: unknown) => {
      if (error instanceof Refusal && error.code === 'reason-required') return null;
      throw error;
    }),
  );
  if (encounter === null)
    return (
      <>
        <PageHead title={`Encounter ${id.toUpperCase()}`} back={<Link href="/bedside">Bedside</Link>} />
        <ReasonAsked identifier={id.toUpperCase()} />
      </>
    );
  const [contents, history] = await Promise.all([
    readEncounterContents(services, encounter),
    readHistory(services, { kind: 'encounter', id: encounter.id }, HISTORY),
  ]);
  return (
    <>
      <EncounterRefresh id={encounter.id} />
      <PageHead
        title={nameOf(encounter)}
        back={<Link href="/bedside">Bedside</Link>}
        action={<Act encounter={encounter} />}
      >
        Born {bornInWords(encounter.birthDate)}, record <span className="mono">{encounter.recordNumber}</span>
        . Encounter <span className="mono">{encounter.number}</span> is{' '}
        {STATUS[encounter.status] ?? encounter.status}, with {counted(contents.clips.length, 'recording')}.
      </PageHead>
      <div className="grid gap-x-8 gap-y-8 plate:grid-cols-[minmax(0,1fr)_300px]">
        <ClipsTable
          href={null}
          first={{ rows: contents.clips }}
          withPatient={false}
          empty={
            <EmptyState title="No recordings yet">
              Open a listening session with a stethoscope: its clips file themselves here.
            </EmptyState>
          }
        />
        <aside className="grid content-start gap-6">
          <Facts encounter={encounter} contents={contents} />
          <Sessions contents={contents} />
          <Section title="What happened">
            <History entries={history} />
          </Section>
        </aside>
      </div>
    </>
  );
}

const HISTORY = ['session-opened', 'session-closed', 'filed', 'filing-superseded', 'kept-anyway'] as const;

function Act({ encounter }: { encounter: EncounterLine }) {
  const [session] = encounter.sessions;
  if (session)
    return (
      <ButtonLink href={`/bedside/sessions/${session.id}`} variant="primary" className="min-h-11">
        To session {session.number}
      </ButtonLink>
    );
  if (encounter.status !== 'in-progress') return null;
  return (
    <ButtonLink
      href={`/bedside/sessions/new?encounter=${encounter.id}`}
      variant="primary"
      className="min-h-11"
    >
      Open a listening session
    </ButtonLink>
  );
}

function Facts({ encounter, contents }: { encounter: EncounterLine; contents: EncounterContents }) {
  return (
    <Section title="Encounter">
      <DefinitionList
        facts={[
          { term: 'Ward', value: encounter.ward ?? 'not known' },
          { term: 'Bed', value: encounter.bed ?? 'not known' },
          { term: 'Began', value: <Time at={encounter.startedAt} mode="minute" className="" /> },
          {
            term: 'Ended',
            value:
              encounter.endedAt === null ? null : <Time at={encounter.endedAt} mode="minute" className="" />,
          },
          {
            term: 'Others',
            value:
              contents.others.length === 0 ? null : (
                <ul>
                  {contents.others.map((other) => (
                    <li key={other.id}>
                      <Link className="link mono" href={`/encounters/${other.id}`}>
                        {other.number}
                      </Link>
                      , <Time at={other.startedAt} mode="date" className="" />
                    </li>
                  ))}
                </ul>
              ),
          },
        ]}
      />
    </Section>
  );
}

function Sessions({ contents }: { contents: EncounterContents }) {
  return (
    <Section title="Listening sessions">
      {contents.sessions.length === 0 ? (
        <p className="text-ink-soft">None yet.</p>
      ) : (
        <ul className="grid gap-1.5">
          {contents.sessions.map((session) => (
            <li key={session.id}>
              <Link className="link mono" href={`/bedside/sessions/${session.id}`}>
                {session.number}
              </Link>{' '}
              <span className="text-ink-soft">
                {session.assetTag}, {session.openedBy},{' '}
                <Time at={session.openedAt} mode="minute" className="" />
                {session.closedAt === null ? ', open' : ''}
              </span>
            </li>
          ))}
        </ul>
      )}
    </Section>
  );
}

function History({ entries }: { entries: Awaited<ReturnType<typeof readHistory>> }) {
  if (entries.length === 0) return <p className="text-ink-soft">Nothing yet.</p>;
  return (
    <ol className="grid gap-3">
      {entries.map((line) => {
        const { title, sentence } = wordedEntry(line.entry);
        const number = line.entry.detail?.number;
        return (
          <li key={line.sequence} className="border-l-2 border-line-strong pl-3">
            <p className="flex flex-wrap justify-between gap-x-3">
              <b>{title}</b>
              <Time at={line.at} className="text-13 text-ink-soft" />
            </p>
            <p className="break-words text-13 text-ink-soft">
              {line.kind.startsWith('session') || typeof number !== 'string' ? null : (
                <>
                  <Link className="link mono" href={`/recordings/${number}`}>
                    {number}
                  </Link>{' '}
                </>
              )}
              {sentence}
            </p>
          </li>
        );
      })}
    </ol>
  );
}
