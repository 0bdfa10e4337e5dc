import { z } from 'zod';
import { countEntriesOf, filedClips, picturesOf, recordingByNumber } from '@/db/queries/recordings';
import { startOfDay } from '@/lib/custody/ledgerSearch';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { type ClipLine, lineOf } from './clipLine';
import { cursor, packed } from './cursor';
import { sightOf } from './sightOf';

export const ClipFilter = z.strictObject({
  verdict: z.enum(['usable', 'care', 'repeat']).optional(),
  /** Asset tag. */
  device: z.string().trim().max(64).optional(),
  /** Id of one of the person's wards. */
  ward: z.string().max(64).optional(),
  /** First and last day, YYYY-MM-DD in the hospital's zone. */
  from: z.iso.date().optional(),
  to: z.iso.date().optional(),
  /** Beginning of a recording, record or encounter number, or of a family name. */
  q: z.string().trim().max(64).default(''),
  before: cursor(z.tuple([z.number().int(), z.string()])).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type ClipFilter = z.infer<typeof ClipFilter>;

export interface FiledLine extends ClipLine {
  encounterId: string;
  encounterNumber: string;
  givenName: string;
  familyName: string;
  recordNumber: string;
}

export interface ClipList {
  rows: FiledLine[];
  /** What to give as `before` for older ones; null at the end. */
  next: string | null;
}

const DAY_MS = 86_400_000;
const dayAfter = (day: string): string => new Date(Date.parse(day) + DAY_MS).toISOString().slice(0, 10);

/** Clips filed to encounters that the person sees, newest first, a page at a time. */
export async function listClips(
  services: Pick<Services, 'read' | 'clock' | 'env'>,
  by: Authorized<'bedside.read'>,
  filter: ClipFilter,
): Promise<ClipList> {
  const zone = services.env.BELLKEEP_TIME_ZONE;
  const rows = await filedClips(services.read, sightOf(services, by), {
    verdict: filter.verdict,
    assetTag: filter.device?.toUpperCase(),
    wardId: filter.ward,
    fromMs: filter.from === undefined ? undefined : startOfDay(filter.from, zone),
    toMs: filter.to === undefined ? undefined : startOfDay(dayAfter(filter.to), zone),
    q: filter.q,
    before: filter.before && { recordedAt: filter.before[0], id: filter.before[1] },
    limit: filter.limit + 1,
  });
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return {
    rows: page.map((row) => ({
      ...lineOf(row),
      encounterId: row.encounterId,
      encounterNumber: row.encounterNumber,
      givenName: row.givenName,
      familyName: row.familyName,
      recordNumber: row.recordNumber,
    })),
    next: rows.length > filter.limit && last ? packed([last.recordedAt, last.id]) : null,
  };
}

/** One recording with everything its page shows; null when there is none. Who may see it is the caller's question. */
export async function readClip(services: Pick<Services, 'read'>, number: string) {
  const row = await recordingByNumber(services.read, number);
  if (!row) return null;
  const [derived, entries] = await Promise.all([
    picturesOf(services.read, row.recording.id),
    countEntriesOf(services.read, row.recording.id),
  ]);
  return { ...row, derived, entries };
}
export type ClipView = NonNullable<Awaited<ReturnType<typeof readClip>>>;
