import type { Metadata } from 'next';
import Link from 'next/link';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { PROBLEMS, type ProblemCode, type ProblemKind } from '@/lib/contract/problems';

export const metadata: Metadata = { title: 'Problems' };

type Line = ProblemKind & { code: string };

const COLUMNS: ColumnOf<Line>[] = [
  { id: 'status', header: 'Status', cell: (line) => <span className="mono">{line.status}</span> },
  {
    id: 'code',
    header: 'Code',
    cell: (line) => (
      <Link href={`/problems/${line.code}`} className="link mono">
        {line.code}
      </Link>
    ),
  },
  { id: 'title', header: 'What it says', wrap: true, cell: (line) => line.title },
  { id: 'next', header: 'Next step', wrap: true, cell: (line) => line.next },
];

/** Every problem that this service answers with (RFC 9457). */
export default function ProblemsPage() {
  const lines = (Object.keys(PROBLEMS) as ProblemCode[])
    .map((code): Line => ({ code, ...PROBLEMS[code] }))
    .sort((a, b) => a.status - b.status || a.code.localeCompare(b.code));
  const table = tableOf(lines, COLUMNS, {
    id: (line) => line.code,
    label: (line) => line.code,
    href: (line) => `/problems/${line.code}`,
  });
  return (
    <div data-wide-page>
      <h1>Problems</h1>
      <p className="mt-2 mb-6 max-w-line text-ink-soft">
        A refusal is a problem document (RFC 9457). The last part of its type is one of these codes; they do
        not change.
      </p>
      <DataTable caption="Problems" {...table} empty={<EmptyState title="None" />} />
    </div>
  );
}
