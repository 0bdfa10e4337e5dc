'use client';

import Link from 'next/link';
import { usePathname, useSearchParams } from 'next/navigation';
import { hrefWith } from './address';
import { Checkbox } from './Checkbox';
import { cx } from './cx';
import type { TableColumn, TableRow } from './tableRows';
import type { TableSelection } from './useTableSelection';

interface TableHeadProps {
  columns: readonly TableColumn[];
  selection: TableSelection | null;
  rows: readonly TableRow[];
  sortParam: string;
}

export function TableHead({ columns, selection, rows, sortParam }: TableHeadProps) {
  const search = useSearchParams();
  const sort = search.get(sortParam) ?? '';
  const selectable = rows.filter((row) => !row.fixed).length;
  return (
    <thead>
      <tr>
        {selection ? (
          <th scope="col" className="w-[34px]">
            <Checkbox
              label="Select all rows on this page"
              labelHidden
              className="-my-2.5 -ml-2"
              disabled={selectable === 0}
              checked={selectable > 0 && selection.ids.length === selectable}
              mixed={selection.ids.length > 0 && selection.ids.length < selectable}
              onChange={(event) => selection.setAll(event.target.checked)}
            />
          </th>
        ) : null}
        {columns.map((column) => (
          <th
            key={column.id}
            scope="col"
            className={cx(column.align === 'right' && 'num')}
            style={column.width ? { width: column.width } : undefined}
            aria-sort={column.sortKey ? directionOf(sort, column.sortKey) : undefined}
          >
            {column.sortKey ? (
              <SortLink column={column} sortKey={column.sortKey} sort={sort} sortParam={sortParam} />
            ) : (
              (column.headerNode ?? column.header)
            )}
          </th>
        ))}
      </tr>
    </thead>
  );
}

const directionOf = (sort: string, key: string) =>
  sort === key ? 'ascending' : sort === `-${key}` ? 'descending' : undefined;

interface SortLinkProps {
  column: TableColumn;
  sortKey: string;
  sort: string;
  sortParam: string;
}

function SortLink({ column, sortKey, sort, sortParam }: SortLinkProps) {
  const pathname = usePathname();
  const search = useSearchParams();
  const direction = directionOf(sort, sortKey);
  // Another order is another list: paging starts afresh.
  const href = hrefWith(pathname, search, {
    [sortParam]: direction === 'ascending' ? `-${sortKey}` : sortKey,
    before: null,
    after: null,
  });
  return (
    <Link href={href} scroll={false} className="underline-offset-3 hover:underline">
      {column.headerNode ?? column.header}
      <span aria-hidden="true" className={direction ? 'text-ink' : 'invisible'}>
        {direction === 'descending' ? ' ↓' : ' ↑'}
      </span>
    </Link>
  );
}
