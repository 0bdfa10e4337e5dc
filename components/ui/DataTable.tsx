'use client';

import { Children, type ReactNode, useRef } from 'react';
import { Button } from './Button';
import { Checkbox } from './Checkbox';
import { ColumnChooser } from './ColumnChooser';
import { cx } from './cx';
import { Notice } from './Notice';
import { Pager } from './Pager';
import { Skeleton } from './Skeleton';
import { TableHead } from './TableHead';
import type { TableColumn, TableRow } from './tableRows';
import { useColumnChoice } from './useColumnChoice';
import { useRowKeys } from './useRowKeys';
import { SelectionContext, type TableSelection, useSelectionOf } from './useTableSelection';
import { useWiderThanItsBox } from './useWiderThanItsBox';

export interface DataTableProps {
  /** Names the table for screen readers. */
  caption: string;
  /** Give one and a column chooser is shown; the choice is kept in the browser under it. */
  tableId?: string;
  columns: readonly TableColumn[];
  rows: readonly TableRow[];
  /** Instead of rows when there are none: what would be here, and how to get the first. */
  empty: ReactNode;
  loading?: boolean;
  error?: { message: string; onRetry?: () => void } | null;
  /** Rows can be selected; these act on the selection (see useTableSelection, SelectedIds). */
  actions?: ReactNode;
  /** Words for the selection: ["device", "devices"]. */
  noun?: readonly [string, string];
  /** Name of the sort parameter in the address; `sort` unless told. */
  sortParam?: string;
  /** "1 to 15 of 212". */
  range?: ReactNode;
  newerHref?: string | null;
  olderHref?: string | null;
  /** More at the foot, such as a link to the CSV. */
  foot?: ReactNode;
}

/**
 * The main furniture. Arrow keys move from row to row, Home and End to the first and last, Enter opens, x selects.
 * Columns and rows are plain data with drawn cells, so a server page can hand them over (see tableOf).
 */
export function DataTable(props: DataTableProps) {
  const { caption, tableId, columns, rows, actions, noun = ['row', 'rows'], sortParam = 'sort' } = props;
  const box = useRef<HTMLDivElement>(null);
  const wide = useWiderThanItsBox(box);
  const { shown, choose } = useColumnChoice(tableId, columns);
  const selection = useSelectionOf(rows);
  const selectable = actions !== undefined;
  const keys = useRowKeys(rows, selectable ? selection.toggle : undefined);
  const chooser = tableId ? <ColumnChooser columns={columns} shown={shown} choose={choose} /> : null;
  return (
    <SelectionContext value={selection}>
      <div
        ref={box}
        className={cx(wide && 'relative overflow-x-auto')}
        {...(wide ? { role: 'region', 'aria-label': `${caption}, table`, tabIndex: 0 } : {})}
      >
        <table className="table" aria-busy={props.loading || undefined}>
          <caption className="sr-only">{caption}</caption>
          <TableHead
            columns={shown}
            selection={selectable ? selection : null}
            rows={rows}
            sortParam={sortParam}
          />
          <tbody {...keys}>
            <Body {...props} shown={shown} selection={selectable ? selection : null} />
          </tbody>
        </table>
      </div>
      {props.range || props.newerHref || props.olderHref || props.foot || chooser ? (
        <Pager
          newerHref={props.newerHref}
          olderHref={props.olderHref}
          more={
            <>
              {Children.toArray(props.foot)}
              {chooser}
            </>
          }
        >
          {props.range}
        </Pager>
      ) : null}
      {selectable && selection.ids.length > 0 ? (
        <SelectionBar selection={selection} noun={noun}>
          {actions}
        </SelectionBar>
      ) : null}
    </SelectionContext>
  );
}

type BodyProps = Pick<DataTableProps, 'rows' | 'empty' | 'loading' | 'error'> & {
  shown: readonly TableColumn[];
  selection: TableSelection | null;
};

function Body({ rows, empty, loading, error, shown, selection }: BodyProps) {
  const span = shown.length + (selection ? 1 : 0);
  if (error)
    return (
      <tr>
        <td colSpan={span} className="wrap">
          <Notice
            tone="alarm"
            title="These rows could not be fetched"
            action={error.onRetry ? <Button onClick={error.onRetry}>Try again</Button> : null}
          >
            {error.message}
          </Notice>
        </td>
      </tr>
    );
  if (loading && rows.length === 0) return <SkeletonRows columns={span} />;
  if (rows.length === 0)
    return (
      <tr>
        <td colSpan={span} className="wrap">
          {empty}
        </td>
      </tr>
    );
  return rows.map((row) => <Row key={row.id} row={row} columns={shown} selection={selection} />);
}

function Row({
  row,
  columns,
  selection,
}: {
  row: TableRow;
  columns: readonly TableColumn[];
  selection: TableSelection | null;
}) {
  const selected = selection?.has(row.id) ?? false;
  return (
    <tr data-row={row.id} data-href={row.href} data-selected={selected || undefined} tabIndex={-1}>
      {selection ? (
        <td className="w-[34px]">
          <Checkbox
            label={`Select ${row.label}`}
            labelHidden
            className="-ml-2"
            checked={selected}
            disabled={row.fixed}
            onChange={() => selection.toggle(row.id)}
          />
        </td>
      ) : null}
      {columns.map((column) => (
        <Cell key={column.id} column={column} row={row} />
      ))}
    </tr>
  );
}

function Cell({ column, row }: { column: TableColumn; row: TableRow }) {
  const content = row.cells[column.id];
  const title =
    row.titles?.[column.id] ?? (column.maxWidth && typeof content === 'string' ? content : undefined);
  return (
    <td className={cx(column.align === 'right' && 'num', column.wrap && 'wrap')} title={title}>
      {column.maxWidth ? (
        <div className={column.wrap ? undefined : 'truncate'} style={{ maxWidth: column.maxWidth }}>
          {content}
        </div>
      ) : (
        content
      )}
    </td>
  );
}

function SkeletonRows({ columns }: { columns: number }) {
  return Array.from({ length: 6 }, (_, row) => (
    // biome-ignore lint/suspicious/noArrayIndexKey: these rows are all alike
    <tr key={row}>
      {Array.from({ length: columns }, (_, column) => (
        // biome-ignore lint/suspicious/noArrayIndexKey: and so are their cells
        <td key={column}>
          <Skeleton className="w-3/4" />
        </td>
      ))}
    </tr>
  ));
}

interface SelectionBarProps {
  selection: TableSelection;
  noun: readonly [string, string];
  children: ReactNode;
}

function SelectionBar({ selection, noun, children }: SelectionBarProps) {
  const count = selection.ids.length;
  return (
    <section
      aria-label="Selection"
      className="on-bar no-print sticky bottom-[76px] z-4 mt-4 flex flex-wrap items-center gap-3 rounded-plate bg-ink px-4 py-3 text-linen plate:bottom-4"
    >
      <span className="mr-auto" role="status">
        <b>
          {count} {count === 1 ? noun[0] : noun[1]} selected
        </b>
      </span>
      {Children.toArray(children)}
      <Button variant="bar" onClick={selection.clear}>
        Clear
      </Button>
    </section>
  );
}
