'use client';

import { useLiveRefresh } from '@/components/shell/LiveEvents';

/** What changes the counts that Bedside's pages speak of. */
const COUNTED = new Set(['filed', 'put-in-tray', 'session-opened', 'session-closed']);

/** Draws the sentence and the tabs anew when their numbers have changed. */
export function CountsRefresh() {
  useLiveRefresh((event) => COUNTED.has(event.kind));
  return null;
}
