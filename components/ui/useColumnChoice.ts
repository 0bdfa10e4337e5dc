'use client';

import { useCallback, useMemo, useSyncExternalStore } from 'react';
import type { TableColumn } from './tableRows';

const EVENT = 'bellkeep-columns';
const keyOf = (tableId: string) => `bellkeep-columns:${tableId}`;

const subscribe = (changed: () => void) => {
  window.addEventListener(EVENT, changed);
  window.addEventListener('storage', changed);
  return () => {
    window.removeEventListener(EVENT, changed);
    window.removeEventListener('storage', changed);
  };
};
const read = (tableId: string): string | null => {
  try {
    return localStorage.getItem(keyOf(tableId));
  } catch {
    return null;
  }
};

/** Which columns of a table a person wants to see, kept in this browser. */
export function useColumnChoice(tableId: string | undefined, columns: readonly TableColumn[]) {
  const stored = useSyncExternalStore(
    subscribe,
    () => (tableId ? read(tableId) : null),
    () => null,
  );
  const shown = useMemo(() => {
    const chosen = stored === null ? null : new Set(stored.split(','));
    return columns.filter((column) => column.fixed || (chosen ? chosen.has(column.id) : !column.hidden));
  }, [columns, stored]);
  const choose = useCallback(
    (ids: readonly string[] | null) => {
      if (!tableId) return;
      try {
        if (ids === null) localStorage.removeItem(keyOf(tableId));
        else localStorage.setItem(keyOf(tableId), ids.join(','));
      } catch {
        // A browser that keeps nothing shows the usual columns.
      }
      window.dispatchEvent(new Event(EVENT));
    },
    [tableId],
  );
  return { shown, choose };
}
