import { z } from 'zod';
import { type TrayRow, trayEntries, trayPage } from '@/db/queries/tray';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { type Candidate, candidatesFor } from './candidates';
import { type ClipLine, lineOf } from './clipLine';
import { cursor, packed } from './cursor';
import { sightOf } from './sightOf';

export const TrayFilter = z.strictObject({
  before: cursor(z.tuple([z.number().int(), z.string()])).optional(),
  limit: z.coerce.number().int().min(1).max(50).default(20),
});
export type TrayFilter = z.infer<typeof TrayFilter>;

export interface TrayLine extends ClipLine {
  ward: string | null;
  scannedIdentifier: string | null;
  /** Why nothing tied it to an encounter, as the entry says that put it here; null when that does not say. */
  why: string | null;
  candidates: Candidate[];
}

export interface Tray {
  rows: TrayLine[];
  /** What to give as `before` for older ones; null at the end. */
  next: string | null;
}

/** Clips that nothing ties to an encounter yet, the latest first, each with why and where it may belong. */
export async function readTray(
  services: Pick<Services, 'read' | 'clock'>,
  by: Authorized<'bedside.read'>,
  filter: TrayFilter,
): Promise<Tray> {
  const sight = sightOf(services, by);
  const rows = await trayPage(services.read, sight, {
    before: filter.before && { measuredAt: filter.before[0], id: filter.before[1] },
    limit: filter.limit + 1,
  });
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  const whys = await whyInTray(services, page);
  const lines: TrayLine[] = [];
  for (const row of page) {
    lines.push({
      ...lineOf(row),
      ward: row.ward,
      scannedIdentifier: row.scannedIdentifier,
      why: whys.get(row.id) ?? null,
      candidates: await candidatesFor(services, row, sight),
    });
  }
  return {
    rows: lines,
    next: rows.length > filter.limit && last ? packed([last.measuredAt ?? 0, last.id]) : null,
  };
}

const PutInTray = z.object({ detail: z.object({ why: z.string() }) });

async function whyInTray(services: Pick<Services, 'read'>, page: TrayRow[]): Promise<Map<string, string>> {
  const entries = await trayEntries(
    services.read,
    page.map((row) => row.id),
  );
  const whys = new Map<string, string>();
  for (const { recordingId, canonical } of entries) {
    const parsed = PutInTray.safeParse(JSON.parse(canonical));
    if (parsed.success) whys.set(recordingId, parsed.data.detail.why);
  }
  return whys;
}
