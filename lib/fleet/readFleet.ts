import { and, asc, desc, eq, gt, inArray, isNotNull, isNull, lte, or, type SQL, sql } from 'drizzle-orm';
import { z } from 'zod';
import { credential, device, deviceModel, recording, SERVICE_STATES, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

const DAY_MS = 86_400_000;
/** "Due" means within this, or over. */
export const DUE_WITHIN_MS = 7 * DAY_MS;
/** A device in service that was not heard from for this long has gone quiet. */
export const QUIET_AFTER_MS = 4 * DAY_MS;

export const FLEET_SORTS = [
  'assetTag',
  '-assetTag',
  'lastHeard',
  '-lastHeard',
  'checkDue',
  '-checkDue',
] as const;

/** A sort value and an id, as JSON. */
function isPlace(text: string): boolean {
  try {
    const place: unknown = JSON.parse(text);
    return (
      Array.isArray(place) &&
      place.length === 2 &&
      ['string', 'number'].includes(typeof place[0]) &&
      typeof place[1] === 'string'
    );
  } catch {
    return false;
  }
}

export const FleetFilter = z.strictObject({
  q: z.string().trim().max(200).default(''),
  state: z.enum(SERVICE_STATES).optional(),
  due: z.enum(['check', 'quiet']).optional(),
  ward: z.string().max(64).optional(),
  model: z.string().max(64).optional(),
  firmware: z.string().max(64).optional(),
  sort: z.enum(FLEET_SORTS).default('assetTag'),
  /** Keyset: sort value and id of the last row of the page before, JSON. */
  after: z.string().max(200).refine(isPlace, 'a place that the list gave').optional(),
  limit: z.coerce.number().int().min(1).max(1000).default(50),
});
export type FleetFilter = z.infer<typeof FleetFilter>;

export interface FleetLine {
  id: string;
  version: number;
  assetTag: string;
  serialNumber: string;
  udi: string | null;
  model: string;
  modelId: string;
  ward: string | null;
  firmware: string | null;
  state: (typeof SERVICE_STATES)[number];
  stateReason: string | null;
  lastHeardAt: number | null;
  batteryPercent: number | null;
  checkDueAt: number | null;
  enrolledAt: number | null;
  /** Its living credential that ends last; null where it has none. */
  credentialEndsAt: number | null;
  bearerOnly: boolean;
  latest: {
    number: string;
    stage: string;
    stopped: string | null;
    verdict: string | null;
    at: number;
  } | null;
  /** Daily medians of the noise floor of its own clips over the last 60 days, oldest first. */
  noiseFloor: { day: number; dbfs: number }[];
}

function where(filter: FleetFilter, now: number): (SQL | undefined)[] {
  const pattern = `%${filter.q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  return [
    filter.q === ''
      ? undefined
      : sql`(${device.assetTag} like ${pattern} escape '\\' or ${device.serialNumber} like ${pattern} escape '\\' or ${device.udi} like ${pattern} escape '\\')`,
    filter.state ? eq(device.state, filter.state) : undefined,
    filter.due === 'check'
      ? and(
          eq(device.state, 'in-service'),
          isNotNull(device.checkDueAt),
          lte(device.checkDueAt, now + DUE_WITHIN_MS),
        )
      : undefined,
    filter.due === 'quiet'
      ? and(
          eq(device.state, 'in-service'),
          or(isNull(device.lastHeardAt), lte(device.lastHeardAt, now - QUIET_AFTER_MS)),
        )
      : undefined,
    filter.ward ? eq(device.wardId, filter.ward) : undefined,
    filter.model ? eq(device.modelId, filter.model) : undefined,
    filter.firmware ? eq(device.firmware, filter.firmware) : undefined,
  ];
}

/** Value by which a page is ordered; nulls come last going up and first going down. */
const sortValue = (sort: FleetFilter['sort']): SQL =>
  sort.endsWith('assetTag')
    ? sql`${device.assetTag}`
    : sort.endsWith('lastHeard')
      ? sql`coalesce(${device.lastHeardAt}, 9e15)`
      : sql`coalesce(${device.checkDueAt}, 9e15)`;

/** The fleet, filtered, sorted and a page at a time. */
export async function readFleet(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'fleet.read'>,
  filter: FleetFilter,
): Promise<{ rows: FleetLine[]; next: string | null; total: number }> {
  const now = services.clock.now();
  const conditions = where(filter, now);
  const value = sortValue(filter.sort);
  const down = filter.sort.startsWith('-');
  const after = filter.after ? (JSON.parse(filter.after) as [string | number, string]) : null;
  const rows = await services.read
    .select({ device, model: deviceModel.name, signs: deviceModel.signsRequests, ward: ward.name, value })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(
      and(
        ...conditions,
        after
          ? down
            ? sql`(${value}, ${device.id}) < (${after[0]}, ${after[1]})`
            : sql`(${value}, ${device.id}) > (${after[0]}, ${after[1]})`
          : undefined,
      ),
    )
    .orderBy(down ? desc(value) : asc(value), down ? desc(device.id) : asc(device.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const ids = page.map((row) => row.device.id);
  const [ends, latest, floors, count] = await Promise.all([
    credentialEnds(services, ids, now),
    latestClips(services, ids),
    noiseFloors(services, ids, now),
    services.read
      .select({ n: sql<number>`count(*)` })
      .from(device)
      .where(and(...conditions)),
  ]);
  const last = page.at(-1);
  return {
    total: count[0]?.n ?? 0,
    next: rows.length > filter.limit && last ? JSON.stringify([last.value, last.device.id]) : null,
    rows: page.map(({ device: d, model, signs, ward: wardName }) => ({
      id: d.id,
      version: d.version,
      assetTag: d.assetTag,
      serialNumber: d.serialNumber,
      udi: d.udi,
      model,
      modelId: d.modelId,
      ward: wardName,
      firmware: d.firmware,
      state: d.state,
      stateReason: d.stateReason,
      lastHeardAt: d.lastHeardAt,
      batteryPercent: d.batteryPercent,
      checkDueAt: d.checkDueAt,
      enrolledAt: d.enrolledAt,
      bearerOnly: !signs,
      credentialEndsAt: ends.get(d.id) ?? null,
      latest: latest.get(d.id) ?? null,
      noiseFloor: floors.get(d.id) ?? [],
    })),
  };
}

async function credentialEnds(
  services: Pick<Services, 'read'>,
  ids: string[],
  now: number,
): Promise<Map<string, number>> {
  if (ids.length === 0) return new Map();
  const rows = await services.read
    .select({ deviceId: credential.deviceId, end: sql<number>`max(${credential.expiresAt})` })
    .from(credential)
    .where(
      and(
        inArray(credential.deviceId, ids),
        inArray(credential.state, ['issued', 'in-use', 'superseded']),
        gt(credential.expiresAt, now),
      ),
    )
    .groupBy(credential.deviceId);
  return new Map(rows.map((row) => [row.deviceId, row.end]));
}

async function latestClips(
  services: Pick<Services, 'read'>,
  ids: string[],
): Promise<Map<string, NonNullable<FleetLine['latest']>>> {
  if (ids.length === 0) return new Map();
  // SQLite: with max() the other columns come from the row that holds the maximum.
  const rows = await services.read
    .select({
      deviceId: recording.deviceId,
      at: sql<number>`max(${recording.awaitedAt})`,
      number: recording.number,
      stage: recording.stage,
      stopped: recording.stopped,
      verdict: recording.verdict,
    })
    .from(recording)
    .where(inArray(recording.deviceId, ids))
    .groupBy(recording.deviceId);
  return new Map(rows.map(({ deviceId, ...clip }) => [deviceId, clip]));
}

/** Daily medians, because patients dominate the scatter of single clips (NIST/SEMATECH e-Handbook, 6.3.2, for the charts drawn of them). */
export async function noiseFloors(
  services: Pick<Services, 'read'>,
  ids: string[],
  now: number,
): Promise<Map<string, { day: number; dbfs: number }[]>> {
  if (ids.length === 0) return new Map();
  const from = now - 60 * DAY_MS;
  const rows = await services.read
    .select({ deviceId: recording.deviceId, at: recording.awaitedAt, dbfs: recording.noiseFloorDbfs })
    .from(recording)
    .where(
      and(
        inArray(recording.deviceId, ids),
        gt(recording.awaitedAt, from),
        isNotNull(recording.noiseFloorDbfs),
      ),
    )
    .orderBy(asc(recording.awaitedAt));
  const days = new Map<string, Map<number, number[]>>();
  for (const row of rows) {
    const day = Math.floor(row.at / DAY_MS);
    const ofDevice = days.get(row.deviceId) ?? new Map<number, number[]>();
    days.set(row.deviceId, ofDevice);
    ofDevice.set(day, [...(ofDevice.get(day) ?? []), row.dbfs ?? 0]);
  }
  const median = (values: number[]): number => {
    const sorted = [...values].sort((a, b) => a - b);
    const middle = sorted.length >> 1;
    return sorted.length % 2
      ? (sorted[middle] ?? 0)
      : ((sorted[middle - 1] ?? 0) + (sorted[middle] ?? 0)) / 2;
  };
  return new Map(
    [...days].map(([id, byDay]) => [
      id,
      [...byDay].map(([day, values]) => ({ day: day * DAY_MS, dbfs: median(values) })),
    ]),
  );
}

/** What the fleet page's sentence and chips count. */
export async function countFleet(services: Pick<Services, 'read' | 'clock'>, _by: Authorized<'fleet.read'>) {
  const now = services.clock.now();
  const count = async (filter: Partial<FleetFilter>) => {
    const [row] = await services.read
      .select({ n: sql<number>`count(*)` })
      .from(device)
      .where(and(...where(FleetFilter.parse(filter), now)));
    return row?.n ?? 0;
  };
  const [all, inService, waiting, quarantined, inRepair, due, quiet] = await Promise.all([
    count({}),
    count({ state: 'in-service' }),
    count({ state: 'waiting' }),
    count({ state: 'quarantined' }),
    count({ state: 'in-repair' }),
    count({ due: 'check' }),
    count({ due: 'quiet' }),
  ]);
  return { all, inService, waiting, quarantined, inRepair, due, quiet };
}

/** Wards, models and firmware versions to filter by. */
export async function fleetChoices(
  services: Pick<Services, 'read'>,
  _by: Authorized<'fleet.read'> | Authorized<'credential.read'>,
) {
  const [wards, models, firmwares] = await Promise.all([
    services.read.select({ id: ward.id, name: ward.name }).from(ward).orderBy(asc(ward.name)),
    services.read
      .select({ id: deviceModel.id, name: deviceModel.name })
      .from(deviceModel)
      .orderBy(asc(deviceModel.name)),
    services.read
      .selectDistinct({ firmware: device.firmware })
      .from(device)
      .where(isNotNull(device.firmware))
      .orderBy(asc(device.firmware)),
  ]);
  return { wards, models, firmwares: firmwares.map((row) => row.firmware ?? '') };
}
