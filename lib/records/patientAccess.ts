import { and, desc, eq, gt, inArray, ne, sql } from 'drizzle-orm';
import { accessReason, encounter, patient } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, type Person, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

/** How long a reason that was given opens a patient. */
export const REASON_LASTS_MS = 12 * 3_600_000;
/** A ward's patient stays visible to it this long after the encounter ended there. */
const AFTER_ENCOUNTER_MS = 30 * 86_400_000;

/** Whether a patient is, or was lately, on one of the person's wards, or a reason for looking was given. */
export async function maySeePatient(
  services: Pick<Services, 'read' | 'clock'>,
  person: Pick<Person, 'id' | 'wardIds'>,
  patientId: string,
): Promise<boolean> {
  const now = services.clock.now();
  if (person.wardIds.length > 0) {
    const [here] = await services.read
      .select({ id: encounter.id })
      .from(encounter)
      .where(
        and(
          eq(encounter.patientId, patientId),
          inArray(encounter.wardId, [...person.wardIds]),
          ne(encounter.status, 'cancelled'),
          sql`coalesce(${encounter.endedAt}, ${now}) > ${now - AFTER_ENCOUNTER_MS}`,
        ),
      )
      .limit(1);
    if (here) return true;
  }
  const [reason] = await services.read
    .select({ id: accessReason.id })
    .from(accessReason)
    .where(
      and(
        eq(accessReason.personId, person.id),
        eq(accessReason.patientId, patientId),
        gt(accessReason.expiresAt, now),
      ),
    )
    .limit(1);
  return reason !== undefined;
}

/** The patient, and where an encounter was named that one, by the exact record number or encounter number. */
async function byExactNumber(from: Services['read'] | Tx, identifier: string) {
  const words = [identifier.trim(), identifier.trim().toUpperCase()];
  const [byRecord] = await from
    .select({ patientId: patient.id })
    .from(patient)
    .where(inArray(patient.recordNumber, words))
    .limit(1);
  if (byRecord) return { patientId: byRecord.patientId, encounterId: null };
  const [byEncounter] = await from
    .select({ patientId: encounter.patientId, encounterId: encounter.id })
    .from(encounter)
    .where(inArray(encounter.number, words))
    .limit(1);
  return byEncounter ?? null;
}

/**
 * Whether exactly this record number or encounter number is of a patient whom the person may not see yet: then a reason
 * is asked for. Only who holds the whole number learns that there is such a patient.
 */
export async function isOutsideWards(
  services: Pick<Services, 'read' | 'clock'>,
  person: Pick<Person, 'id' | 'wardIds'>,
  identifier: string,
): Promise<boolean> {
  if (identifier.trim().length < SHORTEST_NUMBER) return false;
  const found = await byExactNumber(services.read, identifier);
  return found !== null && !(await maySeePatient(services, person, found.patientId));
}

/** Shorter than this no number is looked for. */
export const SHORTEST_NUMBER = 3;

interface GaveReason {
  patientId: string;
  /** The encounter that was named, or the patient's latest. */
  encounterId: string | null;
}

/**
 * Open a patient outside one's wards for twelve hours by giving the reason; the auditor sees it. The patient is named
 * by the exact record number or encounter number, so that nobody leafs through the hospital.
 *
 * @throws Refusal `not-found`
 */
export async function giveReason(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'bedside.read'>,
  wanted: { identifier: string; reason: string },
  remember?: (tx: Tx, answer: GaveReason) => Promise<void>,
): Promise<GaveReason> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const found = await byExactNumber(tx, wanted.identifier);
    if (!found) throw new Refusal('not-found');
    await tx.insert(accessReason).values({
      id: newId(),
      personId: by.id,
      patientId: found.patientId,
      reason: wanted.reason,
      givenAt: now,
      expiresAt: now + REASON_LASTS_MS,
    });
    await appendEntries(tx, now, [
      {
        kind: 'access-outside-wards',
        actor: personActor(by, 'bedside.read'),
        subjects: [
          { kind: 'patient', id: found.patientId },
          { kind: 'person', id: by.id },
        ],
        detail: { reason: wanted.reason },
      },
    ]);
    const answer = {
      patientId: found.patientId,
      encounterId: found.encounterId ?? (await latestEncounter(tx, found.patientId)),
    };
    await remember?.(tx, answer);
    return answer;
  });
}

async function latestEncounter(tx: Tx, patientId: string): Promise<string | null> {
  const [latest] = await tx
    .select({ id: encounter.id })
    .from(encounter)
    .where(eq(encounter.patientId, patientId))
    .orderBy(desc(encounter.startedAt))
    .limit(1);
  return latest?.id ?? null;
}
