import { and, desc, eq, gte, inArray, isNull, lte, or } from 'drizzle-orm';
import { device, encounter, listeningSession, patient, recording, ward } from '@/db/schema';
import type { Services } from '@/lib/platform/services';

export interface Candidate {
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  patientName: string;
  recordNumber: string;
  birthDate: string | null;
  ward: string | null;
  bed: string | null;
  /** Why it is suggested, in words, the strongest first. */
  why: string[];
}

const NEAR_MS = 30 * 60_000;
const MOST = 5;

const minutes = (ms: number): string => `${Math.max(1, Math.round(ms / 60_000))} min`;

/**
 * Encounters that a stray clip may belong to, the likeliest first, each with why. Order: the scanned identifier, then
 * sessions of the same device close in time, then encounters on the device's ward. Nothing is filed by this: a person
 * reads two identifiers first.
 *
 * @param wardIds wards the person sees; encounters elsewhere are not suggested
 */
export async function candidatesFor(
  services: Pick<Services, 'read'>,
  recordingId: string,
  wardIds: readonly string[],
): Promise<Candidate[]> {
  const [clip] = await services.read
    .select({ clip: recording, wardId: device.wardId })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .where(eq(recording.id, recordingId))
    .limit(1);
  if (!clip || wardIds.length === 0) return [];
  const at = clip.clip.recordedAt;
  const rank = new Map<string, { score: number; why: string[] }>();
  const add = (encounterId: string, score: number, why: string) => {
    const before = rank.get(encounterId) ?? { score: 0, why: [] };
    rank.set(encounterId, { score: before.score + score, why: [...before.why, why] });
  };

  const scanned = clip.clip.scannedIdentifier;
  if (scanned !== null) {
    const rows = await services.read
      .select({ id: encounter.id })
      .from(encounter)
      .innerJoin(patient, eq(patient.id, encounter.patientId))
      .where(or(eq(encounter.number, scanned), eq(patient.recordNumber, scanned)))
      .limit(10);
    for (const row of rows) add(row.id, 100, `“${scanned}” was scanned with the clip`);
  }
  const sessions = await services.read
    .select({
      encounterId: listeningSession.encounterId,
      number: listeningSession.number,
      openedAt: listeningSession.openedAt,
      closedAt: listeningSession.closedAt,
    })
    .from(listeningSession)
    .where(
      and(
        eq(listeningSession.deviceId, clip.clip.deviceId),
        gte(listeningSession.openedAt, at - 12 * 3_600_000),
        lte(listeningSession.openedAt, at + NEAR_MS),
      ),
    )
    .orderBy(desc(listeningSession.openedAt))
    .limit(10);
  for (const session of sessions) {
    if (session.openedAt > at)
      add(
        session.encounterId,
        60,
        `session ${session.number} with this device began ${minutes(session.openedAt - at)} later`,
      );
    else if (session.closedAt === null)
      add(session.encounterId, 80, `session ${session.number} with this device was open`);
    else if (at - session.closedAt <= NEAR_MS)
      add(
        session.encounterId,
        70,
        `session ${session.number} with this device had ended ${minutes(Math.max(0, at - session.closedAt))} before`,
      );
    else add(session.encounterId, 20, `this device was with the patient earlier that day`);
  }
  if (clip.wardId !== null) {
    const here = await services.read
      .select({ id: encounter.id })
      .from(encounter)
      .where(
        and(
          eq(encounter.wardId, clip.wardId),
          lte(encounter.startedAt, at),
          or(isNull(encounter.endedAt), gte(encounter.endedAt, at)),
        ),
      )
      .orderBy(desc(encounter.startedAt))
      .limit(20);
    for (const row of here) add(row.id, 5, 'on the ward that the device belongs to, at that time');
  }
  if (rank.size === 0) return [];
  const rows = await services.read
    .select({ encounter, patient, ward: ward.name })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .leftJoin(ward, eq(ward.id, encounter.wardId))
    .where(and(inArray(encounter.id, [...rank.keys()]), inArray(encounter.wardId, [...wardIds])));
  return rows
    .map((row) => ({ row, ...(rank.get(row.encounter.id) ?? { score: 0, why: [] }) }))
    .sort((a, b) => b.score - a.score)
    .slice(0, MOST)
    .map(({ row, why }) => ({
      encounterId: row.encounter.id,
      encounterNumber: row.encounter.number,
      patientId: row.patient.id,
      patientName: `${row.patient.givenName} ${row.patient.familyName}`,
      recordNumber: row.patient.recordNumber,
      birthDate: row.patient.birthDate,
      ward: row.ward,
      bed: row.encounter.bed,
      why,
    }));
}
