import { and, eq, inArray, isNull, sql } from 'drizzle-orm';
import { device, deviceModel, encounter, filing, patient, recording } from '@/db/schema';
import { may } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

export interface FoundThing {
  kind: 'device' | 'recording' | 'patient' | 'encounter';
  label: string;
  detail: string;
  href: string;
}

const LIMIT = 6;

/** What the command box finds: by asset tag, recording number, record number or encounter number, within one's reach. */
export async function findThings(
  services: Pick<Services, 'read'>,
  person: Person,
  q: string,
): Promise<FoundThing[]> {
  const word = q.trim();
  if (word.length < 2) return [];
  const prefix = `${word.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const { read } = services;
  const found: FoundThing[] = [];
  if (may(person.roles, 'fleet.read') || may(person.roles, 'device.read')) {
    const rows = await read
      .select({
        id: device.id,
        assetTag: device.assetTag,
        serialNumber: device.serialNumber,
        model: deviceModel.name,
      })
      .from(device)
      .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
      .where(
        sql`(${device.assetTag} like ${prefix} escape '\\' or ${device.serialNumber} like ${prefix} escape '\\')`,
      )
      .limit(LIMIT);
    found.push(
      ...rows.map((row) => ({
        kind: 'device' as const,
        label: row.assetTag,
        detail: `${row.model}, ${row.serialNumber}`,
        href: `/devices/${row.id}`,
      })),
    );
  }
  const auditor = may(person.roles, 'ledger.read');
  if (!may(person.roles, 'recording.read')) return found;
  const mine = auditor
    ? undefined
    : person.wardIds.length > 0
      ? inArray(encounter.wardId, [...person.wardIds])
      : sql`0`;
  const [recordings, encounters] = await Promise.all([
    read
      .select({ number: recording.number, encounter: encounter.number })
      .from(recording)
      .leftJoin(filing, and(eq(filing.recordingId, recording.id), isNull(filing.supersededAt)))
      .leftJoin(encounter, eq(encounter.id, filing.encounterId))
      .where(and(sql`${recording.number} like ${prefix} escape '\\'`, mine))
      .limit(LIMIT),
    read
      .select({
        id: encounter.id,
        number: encounter.number,
        patientId: patient.id,
        recordNumber: patient.recordNumber,
        name: sql<string>`${patient.givenName} || ' ' || ${patient.familyName}`,
      })
      .from(encounter)
      .innerJoin(patient, eq(patient.id, encounter.patientId))
      .where(
        and(
          sql`(${patient.recordNumber} like ${prefix} escape '\\' or ${encounter.number} like ${prefix} escape '\\' or ${patient.familyName} like ${prefix} escape '\\')`,
          mine,
        ),
      )
      .limit(LIMIT),
  ]);
  found.push(
    ...recordings.map((row) => ({
      kind: 'recording' as const,
      label: row.number,
      detail: row.encounter ? `filed to ${row.encounter}` : 'in the tray',
      href: `/recordings/${row.number}`,
    })),
  );
  found.push(
    ...encounters.map((row) => ({
      kind: 'encounter' as const,
      label: row.recordNumber,
      detail: `${row.name}, ${row.number}`,
      href:
        auditor && !may(person.roles, 'bedside.read')
          ? `/ledger/patient/${row.patientId}`
          : `/encounters/${row.id}`,
    })),
  );
  return found;
}
