import { and, desc, eq, isNull, or, type SQL } from 'drizzle-orm';
import type { Reader } from '../client';
import { device, deviceModel, encounter, filing, patient, recording } from '../schema';
import { beginsWith } from './like';
import { inSight, type Sight, trayDevices } from './sight';

/** Devices whose asset tag or serial number begins with a word. */
export async function devicesLike(read: Reader, word: string, limit: number) {
  return await read
    .select({
      id: device.id,
      assetTag: device.assetTag,
      serialNumber: device.serialNumber,
      model: deviceModel.name,
    })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .where(beginsWith(word, device.assetTag, device.serialNumber))
    .orderBy(device.assetTag)
    .limit(limit);
}

/**
 * Recordings whose number begins with a word: filed ones of encounters in sight, stray ones of the tray in sight.
 *
 * @param sight null sees all
 */
export async function recordingsLike(read: Reader, sight: Sight | null, word: string, limit: number) {
  const visible: SQL | undefined = sight
    ? or(inSight(sight), and(isNull(filing.id), trayDevices(sight)))
    : undefined;
  return await read
    .select({ number: recording.number, stage: recording.stage, encounter: encounter.number })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .leftJoin(encounter, eq(encounter.id, filing.encounterId))
    .where(and(beginsWith(word, recording.number), visible))
    .orderBy(desc(recording.recordedAt))
    .limit(limit);
}

/**
 * Encounters whose number, or whose patient's record number or family name, begins with a word.
 *
 * @param sight null sees all
 */
export async function encountersLike(read: Reader, sight: Sight | null, word: string, limit: number) {
  return await read
    .select({
      id: encounter.id,
      number: encounter.number,
      patientId: patient.id,
      recordNumber: patient.recordNumber,
      givenName: patient.givenName,
      familyName: patient.familyName,
    })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(
      and(
        beginsWith(word, patient.recordNumber, encounter.number, patient.familyName),
        sight ? inSight(sight) : undefined,
      ),
    )
    .orderBy(desc(encounter.startedAt))
    .limit(limit);
}
