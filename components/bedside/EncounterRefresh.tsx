'use client';

import { useLiveRefresh } from '@/components/shell/LiveEvents';
import { changed } from './live';

/** Draws an encounter's page anew when something of it has changed. */
export function EncounterRefresh({ id }: { id: string }) {
  useLiveRefresh((event) => changed(event, { kind: 'encounter', id }));
  return null;
}
