import { and, desc, eq, gt, inArray, sql } from 'drizzle-orm';
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
    const identifier = wanted.identifier.trim().toUpperCase();
    const [byRecord] = await tx
      .select({ id: patient.id })
      .from(patient)
      .where(eq(patient.recordNumber, identifier))
      .limit(1);
    const [byEncounter] = byRecord
      ? [byRecord]
      : await tx
          .select({ id: encounter.patientId })
          .from(encounter)
          .where(eq(encounter.number, identifier))
          .limit(1);
    if (!byEncounter) throw new Refusal('not-found');
    await tx.insert(accessReason).values({
      id: newId(),
      personId: by.id,
      patientId: byEncounter.id,
      reason: wanted.reason,
      givenAt: now,
      expiresAt: now + REASON_LASTS_MS,
    });
    await appendEntries(tx, now, [
      {
        kind: 'access-outside-wards',
        actor: personActor(by, 'bedside.read'),
        subjects: [
          { kind: 'patient', id: byEncounter.id },
          { kind: 'person', id: by.id },
        ],
        detail: { reason: wanted.reason },
      },
    ]);
    const [latest] = await tx
      .select({ id: encounter.id })
      .from(encounter)
      .where(
        and(eq(encounter.patientId, byEncounter.id), byRecord ? undefined : eq(encounter.number, identifier)),
      )
      .orderBy(desc(encounter.startedAt))
      .limit(1);
    const answer = { patientId: byEncounter.id, encounterId: latest?.id ?? null };
    await remember?.(tx, answer);
    return answer;
  });
}
