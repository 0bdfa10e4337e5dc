'use client';

import Link from 'next/link';
import { PassageStrip, type Stage } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { bornInWords } from './words';

interface Line {
  id: string;
  number: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  ward: string | null;
  bed: string | null;
  clips: number;
  latest: {
    number: string;
    stage: string;
    stopped: string | null;
    verdict: string | null;
    at: number;
  } | null;
  session: { id: string; number: string; assetTag: string } | null;
}
interface Answer {
  rows: Line[];
  next: string | null;
}

const COLUMNS: ColumnOf<Line>[] = [
  {
    id: 'patient',
    header: 'Patient',
    maxWidth: '30ch',
    fixed: true,
    cell: (e) => (
      <Link className="link-quiet" href={`/encounters/${e.id}`}>{`${e.familyName}, ${e.givenName}`}</Link>
    ),
    title: (e) => `${e.familyName}, ${e.givenName}`,
  },
  { id: 'born', header: 'Born', cell: (e) => bornInWords(e.birthDate) },
  { id: 'record', header: 'Record', cell: (e) => <span className="mono">{e.recordNumber}</span> },
  { id: 'encounter', header: 'Encounter', cell: (e) => <span className="mono">{e.number}</span> },
  {
    id: 'place',
    header: 'Ward, bed',
    maxWidth: '22ch',
    cell: (e) => [e.ward, e.bed].filter(Boolean).join(', ') || 'not known',
  },
  { id: 'clips', header: 'Clips', align: 'right', cell: (e) => String(e.clips) },
  {
    id: 'latest',
    header: 'Latest clip',
    cell: (e) =>
      e.latest ? (
        <span className="flex items-center gap-3">
          <PassageStrip stage={e.latest.stage as Stage} stopped={e.latest.stopped !== null} />
          {e.latest.verdict ? <VerdictMark verdict={e.latest.verdict as 'usable'} /> : null}
          <Time at={e.latest.at} className="text-13 text-ink-soft" />
        </span>
      ) : (
        <span className="text-ink-soft">none yet</span>
      ),
  },
  {
    id: 'session',
    header: 'Listening session',
    cell: (e) =>
      e.session ? (
        <Link className="link" href={`/bedside/sessions/${e.session.id}`}>
          {e.session.number} with {e.session.assetTag}
        </Link>
      ) : (
        <Link className="link" href={`/bedside/sessions/new?encounter=${e.id}`}>
          Open one
        </Link>
      ),
  },
];

/** Encounters on one's wards; follows what is recorded and filed without a reload. */
export function EncountersTable({
  href,
  first,
  olderHref,
  newerHref,
  filtered,
}: {
  href: string;
  first: Answer;
  olderHref: string | null;
  newerHref: string | null;
  filtered: boolean;
}) {
  const { data, error, mutate } = useData<Answer>(
    href,
    first,
    (event) => concerns(event, 'encounter') || concerns(event, 'session'),
  );
  const table = tableOf(data?.rows ?? [], COLUMNS, {
    id: (e) => e.id,
    label: (e) => `${e.givenName} ${e.familyName}`,
    href: (e) => `/encounters/${e.id}`,
  });
  return (
    <DataTable
      caption="Encounters"
      tableId="encounters"
      {...table}
      error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
      olderHref={olderHref}
      newerHref={newerHref}
      empty={
        <EmptyState title={filtered ? 'No encounter on your wards matches' : 'Nobody is on your wards now'}>
          {filtered
            ? 'Take a filter away. A patient of another ward is opened below, with the exact number and a reason.'
            : 'Encounters come from the hospital’s record system. Ask IT if a patient is missing.'}
        </EmptyState>
      }
    />
  );
}
