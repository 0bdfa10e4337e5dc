import { type Access, type AccessDetail, noteAccess } from '@/lib/custody/noteAccess';
import { type EncounterLine, readEncounter } from '@/lib/filing/readEncounters';
import { type ClipView, readClip } from '@/lib/filing/readRecordings';
import { readSession, type SessionView } from '@/lib/filing/readSession';
import { may } from '@/lib/identity/permissions';
import { type Authorized, type Person, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { isOutsideWards, maySeePatient } from '@/lib/records/patientAccess';

/** Everything here answers `not-found` alike for what does not exist and what the person may not see. */

/**
 * An encounter by its id or number. Who names a patient outside their wards by the whole number of the encounter is
 * asked for a reason.
 *
 * @throws Refusal `not-found`, `reason-required`
 */
export async function reachEncounter(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  idOrNumber: string,
): Promise<EncounterLine> {
  const found = await readEncounter(services, idOrNumber);
  if (!found) throw new Refusal('not-found');
  if (await maySeePatient(services, person, found.patientId)) return found;
  if (found.number === idOrNumber.toUpperCase()) throw reasonRequired(found.number);
  throw new Refusal('not-found');
}

/**
 * A search that found nothing: the number to give a reason for, where it was the whole number of a patient outside the
 * person's wards; else null.
 */
export async function asksReasonFor(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  searched: string,
): Promise<string | null> {
  return (await isOutsideWards(services, person, searched)) ? searched.trim().toUpperCase() : null;
}

export const reasonRequired = (identifier: string): Refusal =>
  new Refusal('reason-required', undefined, { identifier });

export async function reachSession(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  id: string,
): Promise<SessionView> {
  const found = await readSession(services, id);
  if (!found || !(await maySeePatient(services, person, found.patientId))) throw new Refusal('not-found');
  return found;
}

/** A recording that the person may open: filed to a patient they may see, or in the tray of their wards; auditors any. */
export async function reachRecording(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  number: string,
): Promise<ClipView> {
  const found = await readClip(services, number);
  if (!found) throw new Refusal('not-found');
  if (may(person.roles, 'ledger.read')) return found;
  const inReach = found.patient
    ? await maySeePatient(services, person, found.patient.id)
    : found.device.wardId === null || person.wardIds.includes(found.device.wardId);
  if (!inReach) throw new Refusal('not-found');
  return found;
}

/**
 * A recording, with the entry that this person looked at, heard or downloaded it. The entry is written before anything
 * is handed out.
 */
export async function openRecording(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
  person: Authorized<'recording.read'>,
  number: string,
  access: Access,
  detail: Pick<AccessDetail, 'detail' | 'facts'> = {},
): Promise<ClipView> {
  const clip = await reachRecording(services, person, number);
  await noteAccess(services, access, personActor(person, 'recording.read'), clip.recording, {
    subjects: clip.patient ? [{ kind: 'patient', id: clip.patient.id }] : [],
    ...detail,
  });
  return clip;
}
