import { and, desc, eq, gte, inArray, isNull, lte, ne, or, type SQL, sql } from 'drizzle-orm';
import type { Reader } from '../client';
import {
  custodyEntry,
  custodySubject,
  device,
  encounter,
  filing,
  listeningSession,
  patient,
  recording,
  ward,
} from '../schema';
import { clipColumns } from './recordings';
import { inSight, type Sight, trayDevices } from './sight';

const inTray = (sight: Sight): SQL =>
  and(eq(recording.stage, 'measured'), isNull(recording.stopped), trayDevices(sight)) as SQL;

export interface TrayPage {
  before: { measuredAt: number; id: string } | undefined;
  limit: number;
}

/** Clips that nothing ties to an encounter, of the devices of a person's wards, those that came last first. */
export async function trayPage(read: Reader, sight: Sight, page: TrayPage) {
  const { before } = page;
  return await read
    .select({
      ...clipColumns,
      deviceId: recording.deviceId,
      scannedIdentifier: recording.scannedIdentifier,
      wardId: device.wardId,
      ward: ward.name,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(ward, eq(ward.id, device.wardId))
    .where(
      and(
        inTray(sight),
        before
          ? sql`(${recording.measuredAt}, ${recording.id}) < (${before.measuredAt}, ${before.id})`
          : undefined,
      ),
    )
    .orderBy(desc(recording.measuredAt), desc(recording.id))
    .limit(page.limit);
}
export type TrayRow = Awaited<ReturnType<typeof trayPage>>[number];

export async function countTray(read: Reader, sight: Sight): Promise<number> {
  const [row] = await read
    .select({ n: sql<number>`count(*)` })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .where(inTray(sight));
  return row?.n ?? 0;
}

/** The entries that put these recordings into the tray, as they are hashed. */
export async function trayEntries(read: Reader, recordingIds: string[]) {
  if (recordingIds.length === 0) return [];
  return await read
    .select({ recordingId: custodySubject.subjectId, canonical: custodyEntry.canonical })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, 'recording'),
        inArray(custodySubject.subjectId, recordingIds),
        eq(custodyEntry.kind, 'put-in-tray'),
      ),
    );
}

const place = { id: encounter.id, startedAt: encounter.startedAt, endedAt: encounter.endedAt };

/** Encounters that a scanned text names, by their own number or by their patient's. */
export async function encountersNamed(read: Reader, identifier: string) {
  const word = identifier.trim().toUpperCase();
  return await read
    .select({ ...place, status: encounter.status })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(
      or(inArray(encounter.number, [identifier, word]), inArray(patient.recordNumber, [identifier, word])),
    )
    .orderBy(desc(encounter.startedAt))
    .limit(10);
}

/** Sessions of a device that began between two moments, the latest first. */
export async function sessionsOfDevice(read: Reader, deviceId: string, fromMs: number, toMs: number) {
  return await read
    .select({
      encounterId: listeningSession.encounterId,
      number: listeningSession.number,
      openedAt: listeningSession.openedAt,
      closedAt: listeningSession.closedAt,
    })
    .from(listeningSession)
    .where(
      and(
        eq(listeningSession.deviceId, deviceId),
        gte(listeningSession.openedAt, fromMs),
        lte(listeningSession.openedAt, toMs),
      ),
    )
    .orderBy(desc(listeningSession.openedAt))
    .limit(10);
}

/** Encounters with clips of a device between two moments, and the last of those. */
export async function encountersHeardWith(read: Reader, deviceId: string, fromMs: number, toMs: number) {
  return await read
    .select({ encounterId: filing.encounterId, at: sql<number>`max(${recording.recordedAt})` })
    .from(recording)
    .innerJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .where(
      and(
        eq(recording.deviceId, deviceId),
        gte(recording.recordedAt, fromMs),
        lte(recording.recordedAt, toMs),
      ),
    )
    .groupBy(filing.encounterId);
}

/** Encounters that ran on a ward at a moment, those that began last first. */
export async function encountersOnWard(read: Reader, wardId: string, atMs: number) {
  return await read
    .select(place)
    .from(encounter)
    .where(
      and(
        eq(encounter.wardId, wardId),
        ne(encounter.status, 'cancelled'),
        lte(encounter.startedAt, atMs),
        or(isNull(encounter.endedAt), gte(encounter.endedAt, atMs)),
      ),
    )
    .orderBy(desc(encounter.startedAt))
    .limit(40);
}

/** Those of these encounters that the person sees, with their patients. */
export async function candidateRows(read: Reader, sight: Sight, encounterIds: string[]) {
  if (encounterIds.length === 0) return [];
  return await read
    .select({
      encounterId: encounter.id,
      encounterNumber: encounter.number,
      patientId: patient.id,
      givenName: patient.givenName,
      familyName: patient.familyName,
      recordNumber: patient.recordNumber,
      birthDate: patient.birthDate,
      ward: ward.name,
      bed: encounter.bed,
      startedAt: encounter.startedAt,
    })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(and(inArray(encounter.id, encounterIds), inSight(sight)));
}
