'use client';

import Link from 'next/link';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Pager } from '@/components/ui/Pager';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { changed } from './live';
import { bornInWords, listNameOf } from './words';

interface Line {
  id: string;
  number: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  ward: string | null;
  bed: string | null;
  status: string;
  clips: number;
  latest: {
    number: string;
    stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
    stopped: string | null;
    verdict: 'usable' | 'care' | 'repeat' | null;
    at: number;
  } | null;
  sessions: { id: string; number: string; assetTag: string }[];
}
interface Answer {
  rows: Line[];
  next: string | null;
}

const TAP = 'inline-flex min-h-11 items-center';
const placeOf = (e: Line): string => [e.ward, e.bed].filter(Boolean).join(', ') || 'not known';

function Latest({ line }: { line: Line }) {
  if (!line.latest) return <span className="text-ink-soft">none yet</span>;
  const { stage, stopped, verdict, at } = line.latest;
  return (
    <span className="flex items-center gap-3">
      <PassageStrip stage={stage} stopped={stopped !== null} verdict={verdict} />
      {verdict ? <VerdictMark verdict={verdict} /> : null}
      <Time at={at} className="text-13 text-ink-soft" />
    </span>
  );
}

function SessionLinks({ line }: { line: Line }) {
  if (line.sessions.length > 0)
    return (
      <span className="flex flex-wrap gap-x-4">
        {line.sessions.map((session) => (
          <Link key={session.id} className={`link ${TAP}`} href={`/bedside/sessions/${session.id}`}>
            {session.number} with {session.assetTag}
          </Link>
        ))}
      </span>
    );
  if (line.status !== 'in-progress') return <span className="text-ink-soft">the encounter is over</span>;
  return (
    <Link className={`link ${TAP}`} href={`/bedside/sessions/new?encounter=${line.id}`}>
      Open one
    </Link>
  );
}

const COLUMNS: ColumnOf<Line>[] = [
  {
    id: 'patient',
    header: 'Patient',
    maxWidth: '26ch',
    fixed: true,
    cell: (e) => (
      <Link className={`link-quiet ${TAP} max-w-full`} href={`/encounters/${e.id}`}>
        <span className="truncate">{listNameOf(e)}</span>
      </Link>
    ),
    title: listNameOf,
  },
  { id: 'born', header: 'Born', cell: (e) => bornInWords(e.birthDate) },
  { id: 'record', header: 'Record', cell: (e) => <span className="mono">{e.recordNumber}</span> },
  { id: 'place', header: 'Ward, bed', maxWidth: '20ch', cell: placeOf },
  { id: 'session', header: 'Listening session', cell: (e) => <SessionLinks line={e} /> },
  { id: 'latest', header: 'Latest clip', cell: (e) => <Latest line={e} /> },
  { id: 'clips', header: 'Clips', align: 'right', cell: (e) => String(e.clips) },
  { id: 'encounter', header: 'Encounter', cell: (e) => <span className="mono">{e.number}</span> },
];

export interface EncountersTableProps {
  href: string;
  first: Answer;
  /** The next and the first page, by name. */
  nextHref: string | null;
  firstHref: string | null;
  filtered: boolean;
}

/** Encounters that one sees; follows what is recorded and filed without a reload. On a phone each is a few lines. */
export function EncountersTable({ href, first, nextHref, firstHref, filtered }: EncountersTableProps) {
  const { data, error, mutate } = useData<Answer>(href, first, (event) =>
    changed(event, 'encounter', 'session'),
  );
  const rows = data?.rows ?? [];
  const table = tableOf(rows, COLUMNS, {
    id: (e) => e.id,
    label: listNameOf,
    href: (e) => `/encounters/${e.id}`,
  });
  const empty = (
    <EmptyState title={filtered ? 'No encounter on your wards matches' : 'Nobody is on your wards now'}>
      {filtered
        ? 'Take a filter away. A patient of another ward is opened below, with the exact number and a reason.'
        : 'Encounters come from the hospital’s record system. Ask IT if a patient is missing.'}
    </EmptyState>
  );
  const failed = error && !data ? { message: error.message, onRetry: () => void mutate() } : null;
  return (
    <>
      <div className="max-[640px]:hidden">
        <DataTable caption="Encounters" tableId="encounters" {...table} error={failed} empty={empty} />
      </div>
      <div className="min-[641px]:hidden">
        {rows.length === 0 ? (failed?.message ?? empty) : <PhoneList rows={rows} />}
      </div>
      {nextHref || firstHref ? (
        <Pager newerHref={firstHref} newerLabel="From the start" olderHref={nextHref} olderLabel="Next" />
      ) : null}
    </>
  );
}

function PhoneList({ rows }: { rows: readonly Line[] }) {
  return (
    <ul aria-label="Encounters" className="rounded-plate border border-line bg-sheet">
      {rows.map((line) => (
        <li key={line.id} className="grid gap-0.5 border-b border-line px-4 py-2 last:border-b-0">
          <Link className={`link-quiet ${TAP} min-w-0 text-17`} href={`/encounters/${line.id}`}>
            <span className="min-w-0 break-words">{listNameOf(line)}</span>
          </Link>
          <p className="flex flex-wrap gap-x-4 text-ink-soft">
            <span>{bornInWords(line.birthDate)}</span>
            <span className="mono">{line.recordNumber}</span>
            <span>{placeOf(line)}</span>
          </p>
          <div className="flex flex-wrap items-center justify-between gap-x-4">
            <Latest line={line} />
            <SessionLinks line={line} />
          </div>
        </li>
      ))}
    </ul>
  );
}
