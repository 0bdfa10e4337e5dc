import { and, asc, desc, eq, inArray, isNull, ne, or, type SQL, sql } from 'drizzle-orm';
import type { Reader } from '../client';
import { device, encounter, filing, listeningSession, patient, recording, ward } from '../schema';
import { holds } from './like';
import { inSight, ofOwnWards, type Sight } from './sight';

const columns = {
  id: encounter.id,
  number: encounter.number,
  patientId: patient.id,
  familyName: patient.familyName,
  givenName: patient.givenName,
  birthDate: patient.birthDate,
  recordNumber: patient.recordNumber,
  wardId: encounter.wardId,
  ward: ward.name,
  bed: encounter.bed,
  status: encounter.status,
  startedAt: encounter.startedAt,
  endedAt: encounter.endedAt,
};

const withPatient = (read: Reader) =>
  read
    .select(columns)
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .leftJoin(ward, eq(ward.id, encounter.wardId));

export type EncounterRow = Awaited<ReturnType<typeof encounterPage>>[number];

const openSessionOf = sql`exists (
  select 1 from ${listeningSession}
  where ${and(eq(listeningSession.encounterId, encounter.id), isNull(listeningSession.closedAt))}
)`;

// Names are ordered without regard to case; the id decides between namesakes, so that a page begins where one ended.
const byName = [
  sql`${patient.familyName} collate nocase`,
  sql`${patient.givenName} collate nocase`,
  encounter.id,
] as const;

export interface EncounterPage {
  q: string;
  wardId: string | undefined;
  running: boolean;
  listening: boolean;
  after: { familyName: string; givenName: string; id: string } | undefined;
  limit: number;
}

/** Encounters that a person sees, by name. */
export async function encounterPage(read: Reader, sight: Sight, page: EncounterPage) {
  const { after } = page;
  const where: (SQL | undefined)[] = [
    page.wardId === undefined ? inSight(sight) : and(ofOwnWards(sight), eq(encounter.wardId, page.wardId)),
    page.running ? eq(encounter.status, 'in-progress') : undefined,
    page.listening ? openSessionOf : undefined,
    page.q === ''
      ? undefined
      : holds(
          page.q,
          patient.familyName,
          patient.givenName,
          patient.recordNumber,
          encounter.number,
          encounter.bed,
        ),
    after
      ? sql`(${sql.join([...byName], sql`, `)}) > (${after.familyName}, ${after.givenName}, ${after.id})`
      : undefined,
  ];
  return await withPatient(read)
    .where(and(...where))
    .orderBy(...byName.map((part) => asc(part)))
    .limit(page.limit);
}

/** One encounter by its id or by its number. */
export async function encounterBy(read: Reader, idOrNumber: string): Promise<EncounterRow | null> {
  const rows = await withPatient(read)
    .where(or(eq(encounter.id, idOrNumber), eq(encounter.number, idOrNumber.toUpperCase())))
    .limit(1);
  return rows[0] ?? null;
}

/** How many clips are filed to each encounter, and the latest of them. */
export async function latestClips(read: Reader, encounterIds: string[]) {
  if (encounterIds.length === 0) return [];
  // SQLite: beside max() the other columns come from the row that holds the maximum (Bare columns in an aggregate query).
  return await read
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
    .where(and(inArray(filing.encounterId, encounterIds), isNull(filing.supersededAt)))
    .groupBy(filing.encounterId);
}

/** Listening sessions that are open on these encounters, the latest first. */
export async function openSessions(read: Reader, encounterIds: string[]) {
  if (encounterIds.length === 0) return [];
  return await read
    .select({
      encounterId: listeningSession.encounterId,
      id: listeningSession.id,
      number: listeningSession.number,
      assetTag: device.assetTag,
      openedAt: listeningSession.openedAt,
    })
    .from(listeningSession)
    .innerJoin(device, eq(device.id, listeningSession.deviceId))
    .where(and(inArray(listeningSession.encounterId, encounterIds), isNull(listeningSession.closedAt)))
    .orderBy(desc(listeningSession.openedAt));
}

/** Other encounters of the same patient, the latest first. */
export async function otherEncounters(read: Reader, of: { id: string; patientId: string }) {
  return await read
    .select({
      id: encounter.id,
      number: encounter.number,
      status: encounter.status,
      startedAt: encounter.startedAt,
    })
    .from(encounter)
    .where(and(eq(encounter.patientId, of.patientId), ne(encounter.id, of.id)))
    .orderBy(desc(encounter.startedAt))
    .limit(20);
}

const count = { n: sql<number>`count(*)` };

/** Running encounters on the person's wards. */
export async function countRunning(read: Reader, sight: Sight): Promise<number> {
  const [row] = await read
    .select(count)
    .from(encounter)
    .where(and(ofOwnWards(sight), eq(encounter.status, 'in-progress')));
  return row?.n ?? 0;
}

/** Listening sessions that are open on running encounters in sight. */
export async function countListening(read: Reader, sight: Sight): Promise<number> {
  const [row] = await read
    .select(count)
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .where(and(inSight(sight), eq(encounter.status, 'in-progress'), isNull(listeningSession.closedAt)));
  return row?.n ?? 0;
}

export async function wardNames(read: Reader, ids: readonly string[]) {
  return await read
    .select({ id: ward.id, name: ward.name })
    .from(ward)
    .where(inArray(ward.id, [...ids]))
    .orderBy(asc(ward.name));
}
