import { z } from 'zod';
import {
  countListening,
  countRunning,
  type EncounterRow,
  encounterBy,
  encounterPage,
  latestClips,
  openSessions,
  wardNames,
} from '@/db/queries/encounters';
import { countTray } from '@/db/queries/tray';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { cursor, packed } from './cursor';
import { sightOf } from './sightOf';

export const EncounterFilter = z.strictObject({
  q: z.string().trim().max(100).default(''),
  /** Id of one of the person's wards. */
  ward: z.string().max(64).optional(),
  status: z.enum(['in-progress', 'all']).default('in-progress'),
  /** Only those with a listening session open. */
  listening: z.enum(['open']).optional(),
  after: cursor(z.tuple([z.string(), z.string(), z.string()])).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type EncounterFilter = z.infer<typeof EncounterFilter>;

export interface EncounterLine extends EncounterRow {
  /** How many clips are filed to it. */
  clips: number;
  latest: {
    number: string;
    stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
    stopped: string | null;
    verdict: 'usable' | 'care' | 'repeat' | null;
    /** UTC milliseconds. */
    at: number;
  } | null;
  /** Listening sessions that are open, the latest first. */
  sessions: { id: string; number: string; assetTag: string; openedAt: number }[];
}

export interface EncounterList {
  rows: EncounterLine[];
  /** What to give as `after` for the next page; null at the end. */
  next: string | null;
}

/** Encounters on the person's wards and those of patients they opened with a reason, by name, a page at a time. */
export async function listEncounters(
  services: Pick<Services, 'read' | 'clock'>,
  by: Authorized<'bedside.read'>,
  filter: EncounterFilter,
): Promise<EncounterList> {
  const rows = await encounterPage(services.read, sightOf(services, by), {
    q: filter.q,
    wardId: filter.ward,
    running: filter.status === 'in-progress',
    listening: filter.listening === 'open',
    after: filter.after && {
      familyName: filter.after[0],
      givenName: filter.after[1],
      id: filter.after[2],
    },
    limit: filter.limit + 1,
  });
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return {
    rows: await withClips(services, page),
    next: rows.length > filter.limit && last ? packed([last.familyName, last.givenName, last.id]) : null,
  };
}

async function withClips(services: Pick<Services, 'read'>, page: EncounterRow[]): Promise<EncounterLine[]> {
  const ids = page.map((row) => row.id);
  const [clips, sessions] = await Promise.all([
    latestClips(services.read, ids),
    openSessions(services.read, ids),
  ]);
  const clipOf = new Map(clips.map(({ encounterId, ...clip }) => [encounterId, clip]));
  return page.map((row) => {
    const { clips: count, ...latest } = clipOf.get(row.id) ?? { clips: 0 };
    return {
      ...row,
      clips: count,
      latest: 'number' in latest ? latest : null,
      sessions: sessions.flatMap(({ encounterId, ...session }) => (encounterId === row.id ? [session] : [])),
    };
  });
}

/**
 * One encounter with its patient, by id or number, whoever's ward it is on: the caller asks whether the person may see
 * the patient.
 */
export async function readEncounter(
  services: Pick<Services, 'read'>,
  idOrNumber: string,
): Promise<EncounterLine | null> {
  const row = await encounterBy(services.read, idOrNumber);
  return row ? ((await withClips(services, [row]))[0] ?? null) : null;
}

export interface BedsideCounts {
  encounters: number;
  listening: number;
  tray: number;
  wards: { id: string; name: string }[];
}

/** What the page's sentence counts. */
export async function countBedside(
  services: Pick<Services, 'read' | 'clock'>,
  by: Authorized<'bedside.read'>,
): Promise<BedsideCounts> {
  const sight = sightOf(services, by);
  const [encounters, listening, tray, wards] = await Promise.all([
    countRunning(services.read, sight),
    countListening(services.read, sight),
    countTray(services.read, sight),
    wardNames(services.read, by.wardIds),
  ]);
  return { encounters, listening, tray, wards };
}
