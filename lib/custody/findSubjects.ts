import { eq, or, sql } from 'drizzle-orm';
import { device, encounter, listeningSession, patient, recording, user } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import type { Subject } from './entry';

export interface FoundSubject extends Subject {
  /** How people name it. */
  label: string;
  detail: string;
}

const LIMIT = 8;

/**
 * What a word in the ledger's search box may mean: a recording number, an asset tag or serial number, a patient's
 * record number or name, an encounter or session number, or a person of the staff.
 */
export async function findSubjects(services: Pick<Services, 'read'>, word: string): Promise<FoundSubject[]> {
  const q = word.trim();
  if (q === '') return [];
  const upper = q.toUpperCase();
  const prefix = `${q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const { read } = services;
  const [recordings, devices, patients, encounters, sessions, people] = await Promise.all([
    read
      .select({ id: recording.id, label: recording.number, detail: recording.mediaType })
      .from(recording)
      .where(sql`${recording.number} like ${prefix} escape '\\'`)
      .limit(LIMIT),
    read
      .select({ id: device.id, label: device.assetTag, detail: device.serialNumber })
      .from(device)
      .where(or(sql`${device.assetTag} like ${prefix} escape '\\'`, eq(device.serialNumber, q)))
      .limit(LIMIT),
    read
      .select({
        id: patient.id,
        label: patient.recordNumber,
        detail: sql<string>`${patient.givenName} || ' ' || ${patient.familyName}`,
      })
      .from(patient)
      .where(or(eq(patient.recordNumber, upper), sql`${patient.familyName} like ${prefix} escape '\\'`))
      .limit(LIMIT),
    read
      .select({ id: encounter.id, label: encounter.number, detail: encounter.status })
      .from(encounter)
      .where(eq(encounter.number, upper))
      .limit(LIMIT),
    read
      .select({
        id: listeningSession.id,
        label: listeningSession.number,
        detail: sql<string>`'listening session'`,
      })
      .from(listeningSession)
      .where(eq(listeningSession.number, upper))
      .limit(LIMIT),
    read
      .select({ id: user.id, label: user.name, detail: sql<string>`coalesce(${user.jobTitle}, '')` })
      .from(user)
      .where(or(sql`${user.name} like ${`%${prefix}`} escape '\\'`, eq(user.email, q.toLowerCase())))
      .limit(LIMIT),
  ]);
  return [
    ...recordings.map((row) => ({ kind: 'recording' as const, ...row })),
    ...devices.map((row) => ({ kind: 'device' as const, ...row })),
    ...patients.map((row) => ({ kind: 'patient' as const, ...row })),
    ...encounters.map((row) => ({ kind: 'encounter' as const, ...row })),
    ...sessions.map((row) => ({ kind: 'session' as const, ...row })),
    ...people.map((row) => ({ kind: 'person' as const, ...row })),
  ];
}
