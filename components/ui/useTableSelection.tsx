'use client';

import { createContext, useContext, useMemo, useState } from 'react';
import type { TableRow } from './tableRows';

export interface TableSelection {
  ids: readonly string[];
  /** The selected rows that are on this page. */
  rows: readonly TableRow[];
  has: (id: string) => boolean;
  toggle: (id: string) => void;
  setAll: (on: boolean) => void;
  clear: () => void;
}

const none: TableSelection = {
  ids: [],
  rows: [],
  has: () => false,
  toggle: () => undefined,
  setAll: () => undefined,
  clear: () => undefined,
};
export const SelectionContext = createContext<TableSelection>(none);

/** What is selected in the table around: for the buttons in its `actions`. */
export const useTableSelection = (): TableSelection => useContext(SelectionContext);

export function useSelectionOf(rows: readonly TableRow[]): TableSelection {
  const [chosen, setChosen] = useState<ReadonlySet<string>>(new Set());
  return useMemo(() => {
    const selectable = rows.filter((row) => !row.fixed);
    // A row that left the page (filed, filtered away) is no longer selected: nobody acts on what they do not see.
    const present = selectable.filter((row) => chosen.has(row.id));
    return {
      ids: present.map((row) => row.id),
      rows: present,
      has: (id) => chosen.has(id),
      toggle: (id) =>
        setChosen((before) => {
          const next = new Set(before);
          if (!next.delete(id)) next.add(id);
          return next;
        }),
      setAll: (on) => setChosen(on ? new Set(selectable.map((row) => row.id)) : new Set()),
      clear: () => setChosen(new Set()),
    };
  }, [rows, chosen]);
}
