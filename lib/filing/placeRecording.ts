import { and, desc, eq, gte, isNull, lte, or } from 'drizzle-orm';
import { encounter, filing, listeningSession, patient, type recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { newId } from '@/lib/platform/ids';

/**
 * How far a clip may begin before its session was opened: a clinician who opens the session while the device is
 * already recording means that patient. Ours; small against the time a chestpiece needs to reach another bed.
 */
export const BEFORE_SESSION_MS = 5_000;

export interface Placement {
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  by: 'session' | 'identifier';
  sessionId: string | null;
  sessionNumber: string | null;
}
/** Why nothing tied the clip to an encounter: shown in the tray. */
export type TrayReason =
  | 'no-session'
  | 'identifier-unknown'
  | 'identifier-ambiguous'
  | 'identifier-against-session'
  | 'encounter-over';

export type RecordingToPlace = Pick<
  typeof recording.$inferSelect,
  'id' | 'deviceId' | 'recordedAt' | 'scannedIdentifier'
>;

/**
 * Where a measured clip belongs: the listening session that was open on its device when it was recorded, or the
 * encounter whose number or whose patient's record number was scanned. Where the two disagree, or the scan means
 * nobody or more than one encounter, it goes to the tray: a clip in the tray is found, one in the wrong record is not.
 */
export async function placementOf(tx: Tx, clip: RecordingToPlace): Promise<Placement | TrayReason> {
  const session = await sessionAt(tx, clip);
  const scanned =
    clip.scannedIdentifier === null
      ? null
      : await encounterByIdentifier(tx, clip.scannedIdentifier, clip.recordedAt);
  if (typeof scanned === 'string') return scanned;
  if (scanned && session && scanned.patientId !== session.patientId) return 'identifier-against-session';
  if (session) return session;
  return scanned ?? 'no-session';
}

async function sessionAt(tx: Tx, clip: RecordingToPlace): Promise<Placement | null> {
  const [row] = await tx
    .select({ session: listeningSession, encounter })
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .where(
      and(
        eq(listeningSession.deviceId, clip.deviceId),
        lte(listeningSession.openedAt, clip.recordedAt + BEFORE_SESSION_MS),
        or(isNull(listeningSession.closedAt), gte(listeningSession.closedAt, clip.recordedAt)),
      ),
    )
    .orderBy(desc(listeningSession.openedAt))
    .limit(1);
  if (!row) return null;
  return {
    encounterId: row.encounter.id,
    encounterNumber: row.encounter.number,
    patientId: row.encounter.patientId,
    by: 'session',
    sessionId: row.session.id,
    sessionNumber: row.session.number,
  };
}

async function encounterByIdentifier(
  tx: Tx,
  identifier: string,
  recordedAt: number,
): Promise<Placement | TrayReason> {
  const rows = await tx
    .select({ encounter, recordNumber: patient.recordNumber })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(or(eq(encounter.number, identifier), eq(patient.recordNumber, identifier)))
    .orderBy(desc(encounter.startedAt))
    .limit(50);
  if (rows.length === 0) return 'identifier-unknown';
  const current = rows.filter(
    ({ encounter: e }) =>
      e.status !== 'cancelled' &&
      e.startedAt <= recordedAt &&
      (e.endedAt === null || e.endedAt >= recordedAt),
  );
  if (current.length === 0) return 'encounter-over';
  if (current.length > 1) return 'identifier-ambiguous';
  const found = current[0]?.encounter;
  if (!found) return 'identifier-unknown';
  return {
    encounterId: found.id,
    encounterNumber: found.number,
    patientId: found.patientId,
    by: 'identifier',
    sessionId: null,
    sessionNumber: null,
  };
}

/** Write the filing of a freshly measured clip; the caller writes stage and custody entry in the same transaction. */
export async function insertFiling(
  tx: Tx,
  recordingId: string,
  place: Placement,
  nowMs: number,
): Promise<void> {
  await tx.insert(filing).values({
    id: newId(),
    recordingId,
    encounterId: place.encounterId,
    patientId: place.patientId,
    by: place.by,
    sessionId: place.sessionId,
    personId: null,
    reason: null,
    filedAt: nowMs,
  });
}
