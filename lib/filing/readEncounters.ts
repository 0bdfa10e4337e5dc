import { and, asc, desc, eq, inArray, isNull, or, type SQL, sql } from 'drizzle-orm';
import { z } from 'zod';
import { device, encounter, filing, listeningSession, patient, recording, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

export const EncounterFilter = z.strictObject({
  q: z.string().trim().max(100).default(''),
  ward: z.string().max(64).optional(),
  status: z.enum(['in-progress', 'all']).default('in-progress'),
  after: z.string().max(120).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type EncounterFilter = z.infer<typeof EncounterFilter>;

export interface EncounterLine {
  id: string;
  number: string;
  patientId: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  ward: string | null;
  bed: string | null;
  status: string;
  startedAt: number;
  clips: number;
  latest: {
    number: string;
    stage: string;
    stopped: string | null;
    verdict: string | null;
    at: number;
  } | null;
  session: { id: string; number: string; assetTag: string; openedAt: number } | null;
}

const columns = {
  id: encounter.id,
  number: encounter.number,
  patientId: patient.id,
  familyName: patient.familyName,
  givenName: patient.givenName,
  birthDate: patient.birthDate,
  recordNumber: patient.recordNumber,
  ward: ward.name,
  bed: encounter.bed,
  status: encounter.status,
  startedAt: encounter.startedAt,
};

function matching(q: string): SQL | undefined {
  if (q === '') return undefined;
  const pattern = `%${q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  return sql`(${patient.familyName} like ${pattern} escape '\\' or ${patient.givenName} like ${pattern} escape '\\' or ${patient.recordNumber} like ${pattern} escape '\\' or ${encounter.number} like ${pattern} escape '\\' or ${encounter.bed} like ${pattern} escape '\\')`;
}

/** Encounters on the person's wards, by name, a page at a time. Another ward's are not found. */
export async function listEncounters(
  services: Pick<Services, 'read'>,
  by: Authorized<'bedside.read'>,
  filter: EncounterFilter,
): Promise<{ rows: EncounterLine[]; next: string | null }> {
  const wards = by.wardIds.filter((id) => filter.ward === undefined || id === filter.ward);
  if (wards.length === 0) return { rows: [], next: null };
  const [family, id] = (JSON.parse(filter.after ?? '[]') as string[]) ?? [];
  const rows = await services.read
    .select(columns)
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(
      and(
        inArray(encounter.wardId, wards),
        filter.status === 'all' ? undefined : eq(encounter.status, 'in-progress'),
        matching(filter.q),
        id === undefined ? undefined : sql`(${patient.familyName}, ${encounter.id}) > (${family}, ${id})`,
      ),
    )
    .orderBy(asc(patient.familyName), asc(encounter.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const last = page.at(-1);
  return {
    rows: await withClips(services, page),
    next: rows.length > filter.limit && last ? JSON.stringify([last.familyName, last.id]) : null,
  };
}

type Bare = Omit<EncounterLine, 'clips' | 'latest' | 'session'>;

async function withClips(services: Pick<Services, 'read'>, page: Bare[]): Promise<EncounterLine[]> {
  if (page.length === 0) return [];
  const ids = page.map((row) => row.id);
  const [clips, sessions] = await Promise.all([
    // SQLite: with max() the other columns come from the row that holds the maximum.
    services.read
      .select({
        encounterId: filing.encounterId,
        clips: sql<number>`count(*)`,
        at: sql<number>`max(${recording.recordedAt})`,
        number: recording.number,
        stage: recording.stage,
        stopped: recording.stopped,
        verdict: recording.verdict,
      })
      .from(filing)
      .innerJoin(recording, eq(recording.id, filing.recordingId))
      .where(and(inArray(filing.encounterId, ids), isNull(filing.supersededAt)))
      .groupBy(filing.encounterId),
    services.read
      .select({
        encounterId: listeningSession.encounterId,
        id: listeningSession.id,
        number: listeningSession.number,
        assetTag: device.assetTag,
        openedAt: listeningSession.openedAt,
      })
      .from(listeningSession)
      .innerJoin(device, eq(device.id, listeningSession.deviceId))
      .where(and(inArray(listeningSession.encounterId, ids), isNull(listeningSession.closedAt))),
  ]);
  const clipOf = new Map(clips.map((row) => [row.encounterId, row]));
  const sessionOf = new Map(sessions.map((row) => [row.encounterId, row]));
  return page.map((row) => {
    const clip = clipOf.get(row.id);
    const session = sessionOf.get(row.id);
    return {
      ...row,
      clips: clip?.clips ?? 0,
      latest: clip
        ? {
            number: clip.number,
            stage: clip.stage,
            stopped: clip.stopped,
            verdict: clip.verdict,
            at: clip.at,
          }
        : null,
      session: session
        ? { id: session.id, number: session.number, assetTag: session.assetTag, openedAt: session.openedAt }
        : null,
    };
  });
}

/** One encounter with its patient, whoever's ward it is on: the caller asks whether the person may see the patient. */
export async function readEncounter(
  services: Pick<Services, 'read'>,
  id: string,
): Promise<EncounterLine | null> {
  const rows = await services.read
    .select(columns)
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(eq(encounter.id, id))
    .limit(1);
  return (await withClips(services, rows))[0] ?? null;
}

/** What the page's sentence counts on the person's wards. */
export async function countBedside(services: Pick<Services, 'read'>, by: Authorized<'bedside.read'>) {
  const wards = [...by.wardIds];
  if (wards.length === 0)
    return { encounters: 0, sessions: 0, tray: 0, wards: [] as { id: string; name: string }[] };
  const [running, open, tray, names] = await Promise.all([
    services.read
      .select({ n: sql<number>`count(*)` })
      .from(encounter)
      .where(and(inArray(encounter.wardId, wards), eq(encounter.status, 'in-progress'))),
    services.read
      .select({ n: sql<number>`count(*)` })
      .from(listeningSession)
      .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
      .where(and(inArray(encounter.wardId, wards), isNull(listeningSession.closedAt))),
    countTray(services, wards),
    services.read
      .select({ id: ward.id, name: ward.name })
      .from(ward)
      .where(inArray(ward.id, wards))
      .orderBy(asc(ward.name)),
  ]);
  return { encounters: running[0]?.n ?? 0, sessions: open[0]?.n ?? 0, tray, wards: names };
}

/** Clips in the tray that came from a ward's device, or from one that belongs to no ward. */
export const inTrayOf = (wards: string[]): SQL | undefined =>
  and(
    eq(recording.stage, 'measured'),
    isNull(recording.stopped),
    or(isNull(device.wardId), wards.length === 0 ? sql`0` : inArray(device.wardId, wards)),
  );

async function countTray(services: Pick<Services, 'read'>, wards: string[]): Promise<number> {
  const [row] = await services.read
    .select({ n: sql<number>`count(*)` })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .where(inTrayOf(wards));
  return row?.n ?? 0;
}

/** Sessions of an encounter, newest first. */
export async function sessionsOf(services: Pick<Services, 'read'>, encounterId: string) {
  return await services.read
    .select({
      id: listeningSession.id,
      number: listeningSession.number,
      openedAt: listeningSession.openedAt,
      closedAt: listeningSession.closedAt,
      assetTag: device.assetTag,
    })
    .from(listeningSession)
    .innerJoin(device, eq(device.id, listeningSession.deviceId))
    .where(eq(listeningSession.encounterId, encounterId))
    .orderBy(desc(listeningSession.openedAt))
    .limit(50);
}
