import { and, desc, eq, gte, inArray, isNull, lt, lte, or, type SQL, sql } from 'drizzle-orm';
import type { Reader } from '../client';
import {
  custodySubject,
  derivedObject,
  device,
  deviceModel,
  encounter,
  filing,
  listeningSession,
  patient,
  recording,
  user,
  ward,
} from '../schema';
import { beginsWith } from './like';
import { inSight, ofOwnWards, type Sight } from './sight';

/** What a line of a list shows of a clip. */
export const clipColumns = {
  id: recording.id,
  number: recording.number,
  assetTag: device.assetTag,
  site: recording.site,
  recordedAt: recording.recordedAt,
  receivedAt: recording.receivedAt,
  measuredAt: recording.measuredAt,
  durationSeconds: recording.durationSeconds,
  stage: recording.stage,
  stopped: recording.stopped,
  verdict: recording.verdict,
  findings: recording.findings,
  measures: recording.measures,
  keptAt: recording.keptAt,
  keptReason: recording.keptReason,
  version: recording.version,
};

const currentFiling = and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt));
const MOST_OF_ONE = 200;

/** Clips now filed to an encounter, newest first. */
export async function clipsOfEncounter(read: Reader, encounterId: string) {
  return await read
    .select(clipColumns)
    .from(filing)
    .innerJoin(recording, eq(recording.id, filing.recordingId))
    .innerJoin(device, eq(device.id, recording.deviceId))
    .where(and(eq(filing.encounterId, encounterId), isNull(filing.supersededAt)))
    .orderBy(desc(recording.recordedAt), desc(recording.id))
    .limit(MOST_OF_ONE);
}
export type ClipRow = Awaited<ReturnType<typeof clipsOfEncounter>>[number];

/**
 * Clips of a listening session: those it filed that are still with its encounter, and those of its device and window
 * that are on their way. What was moved elsewhere is no longer this patient's.
 */
export async function clipsOfSession(
  read: Reader,
  session: {
    id: string;
    deviceId: string;
    encounterId: string;
    windowFromMs: number;
    windowToMs: number | null;
  },
): Promise<ClipRow[]> {
  return await read
    .select(clipColumns)
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(filing, currentFiling)
    .where(
      and(
        eq(recording.deviceId, session.deviceId),
        or(
          and(eq(filing.sessionId, session.id), eq(filing.encounterId, session.encounterId)),
          and(
            isNull(filing.id),
            inArray(recording.stage, ['awaited', 'received', 'sealed']),
            gte(recording.recordedAt, session.windowFromMs),
            session.windowToMs === null ? undefined : lte(recording.recordedAt, session.windowToMs),
          ),
        ),
      ),
    )
    .orderBy(desc(recording.recordedAt), desc(recording.id))
    .limit(MOST_OF_ONE);
}

export interface ClipPage {
  verdict: 'usable' | 'care' | 'repeat' | undefined;
  assetTag: string | undefined;
  wardId: string | undefined;
  fromMs: number | undefined;
  toMs: number | undefined;
  q: string;
  before: { recordedAt: number; id: string } | undefined;
  limit: number;
}

/** Clips filed to encounters that a person sees, newest first. */
export async function filedClips(read: Reader, sight: Sight, page: ClipPage) {
  const { before } = page;
  const where: (SQL | undefined)[] = [
    page.wardId === undefined ? inSight(sight) : and(ofOwnWards(sight), eq(encounter.wardId, page.wardId)),
    page.verdict ? eq(recording.verdict, page.verdict) : undefined,
    page.assetTag ? eq(device.assetTag, page.assetTag) : undefined,
    page.fromMs === undefined ? undefined : gte(recording.recordedAt, page.fromMs),
    page.toMs === undefined ? undefined : lt(recording.recordedAt, page.toMs),
    page.q === ''
      ? undefined
      : beginsWith(page.q, recording.number, patient.recordNumber, patient.familyName, encounter.number),
    before
      ? sql`(${recording.recordedAt}, ${recording.id}) < (${before.recordedAt}, ${before.id})`
      : undefined,
  ];
  return await read
    .select({
      ...clipColumns,
      encounterId: encounter.id,
      encounterNumber: encounter.number,
      givenName: patient.givenName,
      familyName: patient.familyName,
      recordNumber: patient.recordNumber,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .innerJoin(filing, currentFiling)
    .innerJoin(encounter, eq(encounter.id, filing.encounterId))
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(and(...where))
    .orderBy(desc(recording.recordedAt), desc(recording.id))
    .limit(page.limit);
}

/** One recording with its device, filing and patient, by number; null when there is none. */
export async function recordingByNumber(read: Reader, number: string) {
  const [row] = await read
    .select({
      recording,
      device,
      model: deviceModel,
      filing,
      encounter,
      patient,
      filedBy: user.name,
      session: listeningSession.number,
      wardName: ward.name,
    })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, recording.modelId))
    .leftJoin(filing, currentFiling)
    .leftJoin(encounter, eq(encounter.id, filing.encounterId))
    .leftJoin(patient, eq(patient.id, filing.patientId))
    .leftJoin(user, eq(user.id, filing.personId))
    .leftJoin(listeningSession, eq(listeningSession.id, filing.sessionId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(eq(recording.number, number.toUpperCase()))
    .limit(1);
  return row ?? null;
}

export async function picturesOf(read: Reader, recordingId: string) {
  return await read.select().from(derivedObject).where(eq(derivedObject.recordingId, recordingId));
}

/** How many custody entries speak of a recording. */
export async function countEntriesOf(read: Reader, recordingId: string): Promise<number> {
  const [row] = await read
    .select({ n: sql<number>`count(*)` })
    .from(custodySubject)
    .where(and(eq(custodySubject.subjectKind, 'recording'), eq(custodySubject.subjectId, recordingId)));
  return row?.n ?? 0;
}
