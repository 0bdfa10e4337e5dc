'use client';

import Link from 'next/link';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Pager } from '@/components/ui/Pager';
import { Time } from '@/components/ui/Time';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import type { Role } from '@/lib/identity/permissions';
import { roleWords } from './roleWords';

export interface PersonLine {
  id: string;
  name: string;
  email: string;
  jobTitle: string | null;
  roles: Role[];
  wards: string[];
  secondFactor: boolean;
  lastSignedInAt: number | null;
  leftAt: number | null;
}
export interface PeopleAnswer {
  rows: PersonLine[];
  next: string | null;
}

function SecondFactor({ line }: { line: PersonLine }) {
  if (line.secondFactor) return 'on';
  if (line.roles.includes('itadmin')) return <span className="font-semibold text-rust">missing</span>;
  return <span className="text-ink-soft">none</span>;
}

const COLUMNS: readonly ColumnOf<PersonLine>[] = [
  {
    id: 'name',
    header: 'Name',
    fixed: true,
    cell: (line) => (
      <Link href={`/keyroom/people/${line.id}`} className="link-quiet">
        {line.name}
      </Link>
    ),
  },
  { id: 'job', header: 'Work', maxWidth: '24ch', cell: (line) => line.jobTitle ?? '' },
  { id: 'email', header: 'E-mail', maxWidth: '32ch', cell: (line) => line.email, hidden: true },
  {
    id: 'roles',
    header: 'Roles',
    wrap: true,
    cell: (line) => roleWords(line.roles) || <span className="text-ink-soft">none</span>,
  },
  { id: 'wards', header: 'Wards', maxWidth: '28ch', cell: (line) => line.wards.join(', ') },
  { id: 'factor', header: 'Second factor', cell: (line) => <SecondFactor line={line} /> },
  { id: 'signed-in', header: 'Last signed in', cell: (line) => <Time at={line.lastSignedInAt} ago /> },
];
const LEFT: ColumnOf<PersonLine> = {
  id: 'left',
  header: 'Left',
  cell: (line) => <Time at={line.leftAt} mode="date" />,
};

/** People by name. `query` asks the API for what the address asks the page for. */
export function PeopleTable({
  query,
  first,
  left,
  firstHref,
  nextHref,
}: {
  query: string;
  first: PeopleAnswer;
  left: boolean;
  /** Back to the first page; null on it. */
  firstHref: string | null;
  /** The address of the next page, without the row it goes on from. */
  nextHref: string;
}) {
  const { data, error, mutate } = useData<PeopleAnswer>(`/api/people${query}`, first, (event) =>
    concerns(event, 'person'),
  );
  const answer = data ?? first;
  const table = tableOf(answer.rows, left ? [...COLUMNS, LEFT] : COLUMNS, {
    id: (line) => line.id,
    label: (line) => line.name,
    href: (line) => `/keyroom/people/${line.id}`,
  });
  return (
    <>
      <DataTable
        caption="People"
        tableId="people"
        {...table}
        error={error ? { message: error.message, onRetry: () => void mutate() } : null}
        empty={
          <EmptyState title="Nobody here fits">
            Take a filter away, or invite somebody: they get a mail and choose a password of their own.
          </EmptyState>
        }
      />
      {firstHref || answer.next ? (
        <Pager
          newerLabel="First page"
          olderLabel="Next page"
          newerHref={firstHref}
          olderHref={answer.next ? `${nextHref}after=${encodeURIComponent(answer.next)}` : null}
        />
      ) : null}
    </>
  );
}
