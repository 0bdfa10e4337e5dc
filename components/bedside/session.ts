import type { ShownFinding } from '@/components/recording/FindingsTable';
import type { SiteId } from '@/lib/contract/sites';
import { siteOf } from '@/lib/contract/sites';
import type { SiteState } from './BodyMap';

/** A clip as the API answers it. Times are UTC milliseconds. */
export interface Clip {
  id: string;
  number: string;
  assetTag: string;
  site: string | null;
  recordedAt: number;
  receivedAt: number | null;
  durationSeconds: number | null;
  stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
  stopped: string | null;
  verdict: 'usable' | 'care' | 'repeat' | null;
  findings: ShownFinding[];
  cleanStretch: { from: number; to: number } | null;
  keptAt: number | null;
}

/** A listening session as the API answers it. */
export interface Session {
  id: string;
  number: string;
  openedAt: number;
  closedAt: number | null;
  closedWhy: string | null;
  encounterId: string;
  encounterNumber: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  bed: string | null;
  assetTag: string;
  model: string;
  deviceId: string;
  deviceState: string;
  lastCheckAt: number | null;
  checkDueAt: number | null;
  clips: Clip[];
}

/** Whether a clip settles its site: one that should be recorded again does only when it was kept with a reason. */
export const isDone = (clip: Pick<Clip, 'verdict' | 'keptAt'>): boolean =>
  clip.verdict !== null && (clip.verdict !== 'repeat' || clip.keptAt !== null);

/** State of each site: done as soon as one of its clips can be used or was kept; a later failed try takes nothing away. */
export function siteStates(clips: readonly Clip[]): Partial<Record<SiteId, SiteState>> {
  const states: Partial<Record<SiteId, SiteState>> = {};
  for (const clip of clips) {
    const site = siteOf(clip.site)?.id;
    if (!site || clip.verdict === null || states[site] === 'done') continue;
    states[site] = isDone(clip) ? 'done' : 'repeat';
  }
  return states;
}
