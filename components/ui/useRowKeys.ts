'use client';

import { useRouter } from 'next/navigation';
import { type FocusEvent, type KeyboardEvent, useEffect, useRef } from 'react';
import type { TableRow } from './tableRows';

const rowsOf = (body: HTMLElement) => [...body.querySelectorAll<HTMLTableRowElement>('tr[data-row]')];

/**
 * One row at a time is in the order of the Tab key; arrows, Home and End go to others, Enter opens a row's page,
 * x selects it. Keys pressed inside a control of the row stay with that control.
 */
export function useRowKeys(rows: readonly TableRow[], toggle?: (id: string) => void) {
  const router = useRouter();
  const body = useRef<HTMLTableSectionElement>(null);
  const last = useRef<string>(undefined);
  useEffect(() => {
    if (!body.current) return;
    const drawn = rowsOf(body.current);
    const entry = drawn.find((row) => row.dataset.row === last.current) ?? drawn[0];
    // Only where a key does something is a row a stop at all.
    const useful = toggle !== undefined || rows.some((row) => row.href);
    for (const row of drawn) row.tabIndex = row === entry && useful ? 0 : -1;
  }, [rows, toggle]);
  const onFocus = (event: FocusEvent<HTMLTableSectionElement>) => {
    const row = (event.target as HTMLElement).closest<HTMLTableRowElement>('tr[data-row]');
    if (!row) return;
    last.current = row.dataset.row;
    for (const one of rowsOf(event.currentTarget)) one.tabIndex = one === row ? 0 : -1;
  };
  const onKeyDown = (event: KeyboardEvent<HTMLTableSectionElement>) => {
    const target = event.target as HTMLElement;
    if (event.altKey || event.ctrlKey || event.metaKey) return;
    const row = target.closest<HTMLTableRowElement>('tr[data-row]');
    if (!row || target !== row) return;
    const drawn = rowsOf(event.currentTarget);
    const at = drawn.indexOf(row);
    const goal = { ArrowDown: at + 1, ArrowUp: at - 1, Home: 0, End: drawn.length - 1 }[event.key];
    if (goal !== undefined) {
      event.preventDefault();
      drawn[goal]?.focus();
    } else if (event.key === 'Enter' && row.dataset.href) {
      event.preventDefault();
      router.push(row.dataset.href);
    } else if (event.key === 'x' && toggle && row.dataset.row) {
      event.preventDefault();
      toggle(row.dataset.row);
    }
  };
  return { ref: body, onFocus, onKeyDown };
}
