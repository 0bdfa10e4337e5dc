import { and, eq, inArray, isNull } from 'drizzle-orm';
import type { Reader } from '../client';
import { device, encounter, filing, listeningSession, recording } from '../schema';

export interface SubjectPlace {
  kind: string;
  id: string;
  /** Whose it is, where it is a patient's. */
  patientId: string | null;
  /** For a recording that is nobody's yet: the ward of its device, null where that has none. */
  trayWardId: string | null;
}

/** To whom recordings, sessions and encounters belong now. What is not known is left out. */
export async function placesOf(
  read: Reader,
  ids: { recordings: string[]; sessions: string[]; encounters: string[] },
): Promise<SubjectPlace[]> {
  const [recordings, sessions, encounters] = await Promise.all([
    ids.recordings.length === 0
      ? []
      : read
          .select({ id: recording.id, patientId: filing.patientId, trayWardId: device.wardId })
          .from(recording)
          .innerJoin(device, eq(device.id, recording.deviceId))
          .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
          .where(inArray(recording.id, ids.recordings)),
    ids.sessions.length === 0
      ? []
      : read
          .select({ id: listeningSession.id, patientId: encounter.patientId })
          .from(listeningSession)
          .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
          .where(inArray(listeningSession.id, ids.sessions)),
    ids.encounters.length === 0
      ? []
      : read
          .select({ id: encounter.id, patientId: encounter.patientId })
          .from(encounter)
          .where(inArray(encounter.id, ids.encounters)),
  ]);
  return [
    ...recordings.map((row) => ({ kind: 'recording', ...row })),
    ...sessions.map((row) => ({ kind: 'session', ...row, trayWardId: null })),
    ...encounters.map((row) => ({ kind: 'encounter', ...row, trayWardId: null })),
  ];
}
