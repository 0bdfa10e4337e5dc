'use client';

import type { ReactNode } from 'react';
import { DataTable } from '@/components/ui/DataTable';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { addressWords, programWords } from './roleWords';

export interface SessionLine {
  id: string;
  startedAt: number;
  lastUsedAt: number;
  endsAt: number;
  address: string | null;
  program: string | null;
}

const COLUMNS: readonly ColumnOf<SessionLine>[] = [
  {
    id: 'program',
    header: 'Where',
    cell: (line) => programWords(line.program),
    title: (line) => line.program ?? undefined,
  },
  {
    id: 'address',
    header: 'Address',
    cell: (line) => <span className="mono">{addressWords(line.address)}</span>,
  },
  { id: 'started', header: 'Signed in', cell: (line) => <Time at={line.startedAt} ago /> },
  { id: 'used', header: 'Last used', cell: (line) => <Time at={line.lastUsedAt} ago /> },
];

/** Sessions of one person. `act` draws what can be done with one. */
export function SessionsTable({
  sessions,
  act,
}: {
  sessions: readonly SessionLine[];
  act?: (line: SessionLine) => ReactNode;
}) {
  const columns = act ? [...COLUMNS, { id: 'act', header: 'Act', cell: act }] : COLUMNS;
  const table = tableOf(sessions, columns, {
    id: (line) => line.id,
    label: (line) => programWords(line.program),
  });
  return (
    <DataTable
      caption="Sessions"
      {...table}
      empty={<p className="px-4 py-6 text-ink-soft">Not signed in anywhere.</p>}
    />
  );
}
