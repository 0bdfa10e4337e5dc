'use client';

import { Popover } from 'radix-ui';
import { Checkbox } from './Checkbox';
import type { TableColumn } from './tableRows';

interface ColumnChooserProps {
  columns: readonly TableColumn[];
  shown: readonly TableColumn[];
  choose: (ids: readonly string[] | null) => void;
}

export function ColumnChooser({ columns, shown, choose }: ColumnChooserProps) {
  const on = new Set(shown.map(({ id }) => id));
  const toggle = (id: string) =>
    choose(
      columns
        .filter((column) => (column.id === id ? !on.has(id) : on.has(column.id)))
        .map((column) => column.id),
    );
  return (
    <Popover.Root>
      <Popover.Trigger className="link">Columns</Popover.Trigger>
      <Popover.Portal>
        <Popover.Content
          align="end"
          sideOffset={6}
          aria-label="Columns"
          className="z-30 max-h-[min(420px,var(--radix-popover-content-available-height))] overflow-y-auto rounded-plate border border-line bg-sheet px-4 py-3 shadow-raised"
        >
          {columns.map((column) => (
            <Checkbox
              key={column.id}
              label={column.header}
              checked={on.has(column.id)}
              disabled={column.fixed}
              onChange={() => toggle(column.id)}
            />
          ))}
          <button type="button" className="link mt-2 text-13" onClick={() => choose(null)}>
            The usual columns
          </button>
        </Popover.Content>
      </Popover.Portal>
    </Popover.Root>
  );
}
