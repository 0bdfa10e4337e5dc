import { and, desc, eq, isNull, lt, ne, or, sql } from 'drizzle-orm';
import type { Reader } from '../client';
import {
  device,
  deviceModel,
  encounter,
  filing,
  listeningSession,
  patient,
  recording,
  user,
} from '../schema';
import type { Tx } from '../write';

/** A listening session with its encounter, patient and device. */
export async function sessionById(read: Reader, id: string) {
  const [row] = await read
    .select({
      session: listeningSession,
      encounter,
      patient,
      device,
      model: deviceModel.name,
      openedBy: user.name,
    })
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .innerJoin(device, eq(device.id, listeningSession.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .innerJoin(user, eq(user.id, listeningSession.openedBy))
    .where(eq(listeningSession.id, id))
    .limit(1);
  return row ?? null;
}

/** Sessions of an encounter, newest first. */
export async function sessionsOfEncounter(read: Reader, encounterId: string) {
  return await read
    .select({
      id: listeningSession.id,
      number: listeningSession.number,
      openedAt: listeningSession.openedAt,
      closedAt: listeningSession.closedAt,
      assetTag: device.assetTag,
      openedBy: user.name,
    })
    .from(listeningSession)
    .innerJoin(device, eq(device.id, listeningSession.deviceId))
    .innerJoin(user, eq(user.id, listeningSession.openedBy))
    .where(eq(listeningSession.encounterId, encounterId))
    .orderBy(desc(listeningSession.openedAt))
    .limit(50);
}

/**
 * Open sessions that have had no clip since a moment, and those of encounters that are no longer running.
 *
 * @param quietSinceMs UTC milliseconds
 */
export async function forgottenSessions(from: Reader | Tx, quietSinceMs: number) {
  const latestClip = sql`(
    select max(${recording.recordedAt}) from ${filing} join ${recording} on ${recording.id} = ${filing.recordingId}
    where ${filing.encounterId} = ${listeningSession.encounterId} and ${filing.sessionId} = ${listeningSession.id}
  )`;
  return await from
    .select({
      id: listeningSession.id,
      number: listeningSession.number,
      deviceId: listeningSession.deviceId,
      encounterId: listeningSession.encounterId,
      patientId: encounter.patientId,
      encounterStatus: encounter.status,
    })
    .from(listeningSession)
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .where(
      and(
        isNull(listeningSession.closedAt),
        or(
          ne(encounter.status, 'in-progress'),
          and(lt(listeningSession.openedAt, quietSinceMs), sql`coalesce(${latestClip}, 0) < ${quietSinceMs}`),
        ),
      ),
    )
    .limit(200);
}
