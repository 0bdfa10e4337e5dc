import { and, asc, eq, gt, gte, isNull, or } from 'drizzle-orm';
import { z } from 'zod';
import { custodyEntry, device, deviceModel, encounter, filing, recording, ward } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import type { Services } from '@/lib/platform/services';
import type { AuthorizedClient } from './authorizeClient';

/** A page of a list: `next` is given back as `after`; null at the end for now. */
export interface ClientPage<T> {
  rows: T[];
  next: string | null;
}

const limit = z.coerce.number().int().min(1).max(200).default(100);
export const RecordingsQuery = z.strictObject({
  /** Only those that were announced from here on, UTC ms. */
  since: z.coerce.number().int().min(0).optional(),
  after: z
    .string()
    .regex(/^\d+ [\w-]+$/)
    .optional(),
  limit,
});
export const DevicesQuery = z.strictObject({ after: z.string().max(100).optional(), limit });
export const LedgerQuery = z.strictObject({
  /** Sequence number of the last entry of the page before. */
  after: z.coerce.number().int().min(-1).default(-1),
  limit,
});

function paged<T>(rows: T[], most: number, keyOf: (last: T) => string): ClientPage<T> {
  const page = rows.slice(0, most);
  const last = page.at(-1);
  return { rows: page, next: rows.length > most && last !== undefined ? keyOf(last) : null };
}

/**
 * Recordings, the oldest first: what is technical, and the encounter's number. Each page that is not empty is an entry
 * of the log that names its recordings: somebody took a copy.
 */
export async function readRecordings(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
  by: AuthorizedClient<'recordings.read'>,
  query: z.infer<typeof RecordingsQuery>,
) {
  const [at, id] = query.after?.split(' ') ?? [];
  const rows = await services.read
    .select({
      id: recording.id,
      number: recording.number,
      assetTag: device.assetTag,
      stage: recording.stage,
      stopped: recording.stopped,
      verdict: recording.verdict,
      recordedAt: recording.recordedAt,
      announcedAt: recording.awaitedAt,
      filedAt: recording.filedAt,
      durationSeconds: recording.durationSeconds,
      mediaType: recording.mediaType,
      bytes: recording.declaredBytes,
      sha256: recording.declaredSha256,
      site: recording.site,
      encounter: encounter.number,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .leftJoin(encounter, eq(encounter.id, filing.encounterId))
    .where(
      and(
        query.since === undefined ? undefined : gte(recording.awaitedAt, query.since),
        at && id
          ? or(
              gt(recording.awaitedAt, Number(at)),
              and(eq(recording.awaitedAt, Number(at)), gt(recording.id, id)),
            )
          : undefined,
      ),
    )
    .orderBy(asc(recording.awaitedAt), asc(recording.id))
    .limit(query.limit + 1);
  const page = paged(rows, query.limit, (last) => `${last.announcedAt} ${last.id}`);
  if (page.rows.length > 0)
    await services.write((tx) =>
      appendEntries(tx, services.clock.now(), [
        {
          kind: 'exported',
          actor: { kind: 'service', id: by.id, label: by.name },
          subjects: [
            { kind: 'client', id: by.id },
            ...page.rows.map((row) => ({ kind: 'recording' as const, id: row.id })),
          ],
          detail: { to: by.name, count: page.rows.length },
        },
      ]),
    );
  return { rows: page.rows.map(({ id: _id, ...row }) => row), next: page.next };
}

/** Devices by asset tag. */
export async function readDevices(
  services: Pick<Services, 'read'>,
  _by: AuthorizedClient<'devices.read'>,
  query: z.infer<typeof DevicesQuery>,
) {
  const rows = await services.read
    .select({
      assetTag: device.assetTag,
      serialNumber: device.serialNumber,
      udi: device.udi,
      maker: deviceModel.maker,
      model: deviceModel.name,
      ward: ward.name,
      state: device.state,
      firmware: device.firmware,
      enrolledAt: device.enrolledAt,
      lastHeardAt: device.lastHeardAt,
      batteryPercent: device.batteryPercent,
      checkDueAt: device.checkDueAt,
    })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(query.after === undefined ? undefined : gt(device.assetTag, query.after))
    .orderBy(asc(device.assetTag))
    .limit(query.limit + 1);
  return paged(rows, query.limit, (last) => last.assetTag);
}

/** The custody log from its beginning: each entry as it is hashed, and its leaf hash (RFC 6962, 2.1) in hex. */
export async function readLedger(
  services: Pick<Services, 'read'>,
  _by: AuthorizedClient<'ledger.read'>,
  query: z.infer<typeof LedgerQuery>,
) {
  const rows = await services.read
    .select({
      sequence: custodyEntry.sequence,
      canonical: custodyEntry.canonical,
      leafHash: custodyEntry.leafHash,
    })
    .from(custodyEntry)
    .where(gt(custodyEntry.sequence, query.after))
    .orderBy(asc(custodyEntry.sequence))
    .limit(query.limit + 1);
  const page = paged(rows, query.limit, (last) => String(last.sequence));
  return {
    ...page,
    rows: page.rows.map((row) => ({ ...row, leafHash: Buffer.from(row.leafHash).toString('hex') })),
  };
}
