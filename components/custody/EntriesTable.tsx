import type { ReactNode } from 'react';
import { DataTable } from '@/components/ui/DataTable';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import type { ThreadLine } from './CustodyThread';
import { actorWords, wordedEntry } from './entryWords';

const COLUMNS: ColumnOf<ThreadLine>[] = [
  {
    id: 'sequence',
    header: 'Entry',
    align: 'right',
    cell: (line) => <span className="font-mono">{line.sequence.toLocaleString('en-GB')}</span>,
  },
  { id: 'at', header: 'When', cell: (line) => <Time at={line.at} mode="second" /> },
  { id: 'what', header: 'What happened', cell: (line) => <b>{wordedEntry(line.entry).title}</b> },
  {
    id: 'sentence',
    header: 'To which',
    maxWidth: '46ch',
    cell: (line) => wordedEntry(line.entry).sentence,
    title: (line) => wordedEntry(line.entry).sentence,
  },
  { id: 'who', header: 'Who', maxWidth: '28ch', cell: (line) => actorWords(line.entry.actor) },
];

const numberOf = (line: ThreadLine): string | undefined => {
  const number = line.entry.detail?.number;
  return typeof number === 'string' && /^[0-9A-Z]{4}-[0-9A-Z]{4}$/.test(number) ? number : undefined;
};

/** Entries of the log, newest first. Enter opens the recording's thread where an entry speaks of one. */
export function EntriesTable({
  rows,
  olderHref,
  newerHref,
  empty,
  foot,
}: {
  rows: readonly ThreadLine[];
  olderHref: string | null;
  newerHref: string | null;
  empty: ReactNode;
  foot?: ReactNode;
}) {
  const columns: ColumnOf<ThreadLine>[] = [
    ...COLUMNS.slice(0, 3),
    {
      id: 'recording',
      header: 'Recording',
      cell: (line) => {
        const number = numberOf(line);
        return number ? (
          <a className="link font-mono" href={`/ledger/recordings/${number}`}>
            {number}
          </a>
        ) : (
          ''
        );
      },
    },
    ...COLUMNS.slice(3),
  ];
  const table = tableOf(rows, columns, {
    id: (line) => String(line.sequence),
    label: (line) => `entry ${line.sequence}`,
    href: (line) => (numberOf(line) ? `/ledger/recordings/${numberOf(line)}` : undefined),
  });
  return (
    <DataTable
      caption="Custody entries"
      tableId="ledger"
      {...table}
      empty={empty}
      olderHref={olderHref}
      newerHref={newerHref}
      foot={foot}
    />
  );
}
