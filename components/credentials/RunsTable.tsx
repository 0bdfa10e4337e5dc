'use client';

import Link from 'next/link';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { RUN_WORDS, type RunRow, totalOf } from './runWords';

const COLUMNS: ColumnOf<RunRow>[] = [
  {
    id: 'label',
    header: 'Run',
    fixed: true,
    cell: (run) => (
      <Link className="link mono" href={`/keyroom/rotations/${run.id}`}>
        {run.label}
      </Link>
    ),
  },
  { id: 'state', header: 'State', cell: (run) => RUN_WORDS[run.state] },
  {
    id: 'done',
    header: 'Renewed',
    cell: (run) => `${run.counts.done} of ${totalOf(run)}`,
  },
  { id: 'missed', header: 'Missed', cell: (run) => (run.counts.missed === 0 ? 'none' : run.counts.missed) },
  { id: 'started', header: 'Started', cell: (run) => <Time at={run.startedAt} mode="minute" /> },
  { id: 'deadline', header: 'Deadline', cell: (run) => <Time at={run.deadlineAt} mode="minute" /> },
  { id: 'by', header: 'By', maxWidth: '22ch', cell: (run) => run.startedBy },
  { id: 'reason', header: 'Reason', maxWidth: '36ch', cell: (run) => run.reason },
];

/** Rotation runs, the youngest first. */
export function RunsTable({
  href,
  first,
  olderHref,
  newerHref,
}: {
  href: string;
  first: { rows: RunRow[]; next: string | null };
  olderHref: string | null;
  newerHref: string | null;
}) {
  const { data, error, mutate } = useData<{ rows: RunRow[] }>(href, first, (event) =>
    concerns(event, 'rotation'),
  );
  const table = tableOf(data?.rows ?? [], COLUMNS, {
    id: (run) => run.id,
    label: (run) => run.label,
    href: (run) => `/keyroom/rotations/${run.id}`,
  });
  return (
    <DataTable
      caption="Rotation runs"
      tableId="rotations"
      {...table}
      olderHref={olderHref}
      newerHref={newerHref}
      error={error && !data ? { message: error.message, onRetry: () => void mutate() } : null}
      empty={
        <EmptyState title="No rotation run yet">
          Start one with the button above: over all credentials, a ward, a model, or those that end soon.
        </EmptyState>
      }
    />
  );
}
