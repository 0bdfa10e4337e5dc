import { devicesLike, encountersLike, recordingsLike } from '@/db/queries/search';
import { sightOf } from '@/lib/filing/sightOf';
import { may, ROOMS } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { isOutsideWards } from '@/lib/records/patientAccess';

export interface FoundThing {
  kind: 'device' | 'recording' | 'patient' | 'encounter' | 'room';
  label: string;
  detail: string;
  href: string;
}

const SHORTEST_WORD = 2;
const MOST = 6;

/**
 * What the command box finds: devices by asset tag or serial number, recordings by number, patients by record number,
 * encounter number or family name, and rooms; all within the person's reach. The whole number of a patient outside
 * their wards is answered with the way to giving a reason, and with nothing about the patient.
 */
export async function findThings(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  q: string,
): Promise<FoundThing[]> {
  const word = q.trim();
  if (word.length < SHORTEST_WORD) return [];
  const rooms = ROOMS.filter(
    ({ name, permission }) =>
      may(person.roles, permission) && name.toLowerCase().startsWith(word.toLowerCase()),
  ).map(({ name, href }): FoundThing => ({ kind: 'room', label: name, detail: '', href }));
  return [
    ...(await foundDevices(services, person, word)),
    ...(await foundClinical(services, person, word)),
    ...rooms,
  ];
}

async function foundDevices(
  services: Pick<Services, 'read'>,
  person: Person,
  word: string,
): Promise<FoundThing[]> {
  if (!may(person.roles, 'device.read')) return [];
  const rows = await devicesLike(services.read, word, MOST);
  return rows.map((row) => ({
    kind: 'device',
    label: row.assetTag,
    detail: `${row.model}, ${row.serialNumber}`,
    href: `/devices/${row.id}`,
  }));
}

async function foundClinical(
  services: Pick<Services, 'read' | 'clock'>,
  person: Person,
  word: string,
): Promise<FoundThing[]> {
  if (!may(person.roles, 'recording.read')) return [];
  const bedside = may(person.roles, 'bedside.read');
  const sight = may(person.roles, 'ledger.read') ? null : sightOf(services, person);
  const [recordings, encounters] = await Promise.all([
    recordingsLike(services.read, sight, word, MOST),
    encountersLike(services.read, sight, word, MOST),
  ]);
  const found: FoundThing[] = [
    ...recordings.map((row) => ({
      kind: 'recording' as const,
      label: row.number,
      detail: row.encounter
        ? `filed to ${row.encounter}`
        : row.stage === 'measured'
          ? 'in the tray'
          : `on its way, ${row.stage}`,
      href: `/recordings/${row.number}`,
    })),
    ...encounters.map((row) => ({
      kind: 'encounter' as const,
      label: row.recordNumber,
      detail: `${row.givenName} ${row.familyName}, ${row.number}`,
      href: bedside ? `/encounters/${row.id}` : `/ledger/patient/${row.patientId}`,
    })),
  ];
  if (bedside && sight && encounters.length === 0 && (await isOutsideWards(services, person, word)))
    found.push({
      kind: 'patient',
      label: word.toUpperCase(),
      detail: 'outside your wards: a reason is asked for',
      href: `/bedside?q=${encodeURIComponent(word.toUpperCase())}`,
    });
  return found;
}
