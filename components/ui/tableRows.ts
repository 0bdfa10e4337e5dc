import type { ReactNode } from 'react';

export interface TableColumn {
  id: string;
  header: string;
  /** Shown instead of `header` in the head; `header` stays the name in the column chooser. */
  headerNode?: ReactNode;
  align?: 'left' | 'right';
  /** CSS width of the column. */
  width?: string;
  /** Longest width of the content, CSS; beyond it the text ends in an ellipsis, whole on hover. */
  maxWidth?: string;
  /** Value of the `sort` parameter that sorts by this column; `-` before it turns it round. */
  sortKey?: string;
  /** Lines may wrap. */
  wrap?: boolean;
  /** Not shown until it is chosen. */
  hidden?: boolean;
  /** Can not be taken away. */
  fixed?: boolean;
}

export interface TableRow {
  id: string;
  /** Names the row for its checkbox: the asset tag, the recording's number. */
  label: string;
  /** Where Enter leads. */
  href?: string;
  cells: Record<string, ReactNode>;
  /** Whole text of cells that are not plain strings, for hovering. */
  titles?: Record<string, string>;
  /** This row can not be selected. */
  fixed?: boolean;
}

export interface ColumnOf<Item> extends TableColumn {
  cell: (item: Item) => ReactNode;
  title?: (item: Item) => string | undefined;
}

/**
 * Columns and rows for a DataTable out of things and what to show of them. Runs on the server as well: the cells
 * are drawn there and only the drawn cells travel.
 */
export function tableOf<Item>(
  items: readonly Item[],
  columns: readonly ColumnOf<Item>[],
  row: {
    id: (item: Item) => string;
    label: (item: Item) => string;
    href?: (item: Item) => string | undefined;
  },
): { columns: TableColumn[]; rows: TableRow[] } {
  return {
    columns: columns.map(({ cell: _cell, title: _title, ...column }) => column),
    rows: items.map((item) => ({
      id: row.id(item),
      label: row.label(item),
      href: row.href?.(item),
      cells: Object.fromEntries(columns.map((column) => [column.id, column.cell(item)])),
      titles: Object.fromEntries(
        columns.flatMap((column) => {
          const title = column.title?.(item);
          return title ? [[column.id, title]] : [];
        }),
      ),
    })),
  };
}
