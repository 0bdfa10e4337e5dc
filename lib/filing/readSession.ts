import { clipsOfSession } from '@/db/queries/recordings';
import { sessionById } from '@/db/queries/sessions';
import type { Services } from '@/lib/platform/services';
import { type ClipLine, lineOf } from './clipLine';
import { BEFORE_SESSION_MS } from './placeRecording';

/** A listening session as its page shows it. Times are UTC milliseconds. */
export interface SessionView {
  id: string;
  number: string;
  openedAt: number;
  openedBy: string;
  closedAt: number | null;
  closedWhy: string | null;
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  bed: string | null;
  assetTag: string;
  model: string;
  deviceId: string;
  deviceState: string;
  lastCheckAt: number | null;
  checkDueAt: number | null;
  clips: ClipLine[];
}

/**
 * A listening session with the clips of its window: those it filed, and those still on their way from its device. The
 * caller has checked, or checks, that the person may see the patient.
 */
export async function readSession(services: Pick<Services, 'read'>, id: string): Promise<SessionView | null> {
  const row = await sessionById(services.read, id);
  if (!row) return null;
  const { session, encounter, patient, device } = row;
  const clips = await clipsOfSession(services.read, {
    id: session.id,
    deviceId: session.deviceId,
    encounterId: session.encounterId,
    windowFromMs: session.openedAt - BEFORE_SESSION_MS,
    windowToMs: session.closedAt,
  });
  return {
    id: session.id,
    number: session.number,
    openedAt: session.openedAt,
    openedBy: row.openedBy,
    closedAt: session.closedAt,
    closedWhy: session.closedWhy,
    encounterId: encounter.id,
    encounterNumber: encounter.number,
    patientId: patient.id,
    familyName: patient.familyName,
    givenName: patient.givenName,
    birthDate: patient.birthDate,
    recordNumber: patient.recordNumber,
    bed: encounter.bed,
    assetTag: device.assetTag,
    model: row.model,
    deviceId: device.id,
    deviceState: device.state,
    lastCheckAt: device.lastCheckAt,
    checkDueAt: device.checkDueAt,
    clips: clips.map(lineOf),
  };
}
