import { type ClipView, readClip, readSession, type SessionView } from '@/lib/filing/readClips';
import { type EncounterLine, readEncounter } from '@/lib/filing/readEncounters';
import { may } from '@/lib/identity/permissions';
import type { Authorized, Person } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { maySeePatient } from '@/lib/records/patientAccess';

/** Everything here answers `not-found` alike for what does not exist and what the person may not see. */

export async function reachEncounter(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  id: string,
): Promise<EncounterLine> {
  const found = await readEncounter(services, id);
  if (!found || !(await maySeePatient(services, person, found.patientId))) throw new Refusal('not-found');
  return found;
}

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
  person: Authorized<'recording.read'> | Person,
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
