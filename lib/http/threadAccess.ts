import { and, eq, isNull } from 'drizzle-orm';
import { device, filing, recording } from '@/db/schema';
import { may } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { maySeePatient } from '@/lib/records/patientAccess';

/** A recording whose thread this person may read, by its number; null when there is none or it is out of their reach. */
export async function recordingForThread(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  number: string,
) {
  const [row] = await services.read
    .select({ recording, assetTag: device.assetTag, patientId: filing.patientId })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId))
    .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
    .where(eq(recording.number, number.toUpperCase()))
    .limit(1);
  if (!row) return null;
  const reach =
    may(person.roles, 'ledger.read') ||
    (may(person.roles, 'recording.read') &&
      (row.patientId === null || (await maySeePatient(services, person, row.patientId))));
  return reach ? { ...row.recording, assetTag: row.assetTag } : null;
}

/** Whether a person may read threads of a kind of thing at all. Patients and people are the auditor's alone. */
export function mayReadThread(person: Person, kind: string): boolean {
  if (may(person.roles, 'ledger.read')) return true;
  if (kind === 'device') return may(person.roles, 'fleet.read');
  if (kind === 'credential') return may(person.roles, 'credential.read');
  if (kind === 'person') return may(person.roles, 'people.read');
  return false;
}
