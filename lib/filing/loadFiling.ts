import { and, eq, isNull } from 'drizzle-orm';
import { encounter, filing, patient, recording, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Subject } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import { type Identifiers, identifiersMatch } from './identifiers';

export interface Filed {
  recording: string;
  encounter: string;
}

/**
 * The encounter to file to, with its patient, when the identifiers are that patient's.
 *
 * @throws Refusal `not-found`, `identifiers-mismatch`
 */
export async function loadTarget(tx: Tx, encounterId: string, identifiers: Identifiers) {
  const [target] = await tx
    .select({ encounter, patient })
    .from(encounter)
    .innerJoin(patient, eq(patient.id, encounter.patientId))
    .where(eq(encounter.id, encounterId))
    .limit(1);
  if (!target) throw new Refusal('not-found');
  if (!identifiersMatch(identifiers, target.patient))
    throw new Refusal('identifiers-mismatch', undefined, {
      errors: [
        {
          path: 'identifiers.recordNumber',
          message: 'these two do not belong to the patient of this encounter',
        },
      ],
    });
  return target;
}

/**
 * A recording that can be filed, and where it is filed now.
 *
 * @throws Refusal `not-found`, also for one that is in quarantine; `not-possible` while it is on its way
 */
export async function loadClip(tx: Tx, number: string) {
  const [clip] = await tx.select().from(recording).where(eq(recording.number, number.toUpperCase())).limit(1);
  if (!clip || clip.stopped !== null) throw new Refusal('not-found');
  if (clip.stage !== 'measured' && clip.stage !== 'filed')
    throw new Refusal('not-possible', `${clip.number} is still on its way (${clip.stage}).`);
  const [current] = await tx
    .select({ filing, encounterNumber: encounter.number, person: user.name })
    .from(filing)
    .innerJoin(encounter, eq(encounter.id, filing.encounterId))
    .leftJoin(user, eq(user.id, filing.personId))
    .where(and(eq(filing.recordingId, clip.id), isNull(filing.supersededAt)))
    .limit(1);
  return { clip, current: current ?? null };
}

export const subjectsOf = (
  clip: { id: string; deviceId: string },
  place: { id: string; patientId: string },
): Subject[] => [
  { kind: 'recording', id: clip.id },
  { kind: 'encounter', id: place.id },
  { kind: 'patient', id: place.patientId },
  { kind: 'device', id: clip.deviceId },
];

/** Write that a person filed a recording; stage, version and custody entry are the caller's, in the same transaction. */
export async function insertPersonFiling(
  tx: Tx,
  recordingId: string,
  place: { id: string; patientId: string },
  by: { personId: string; reason: string | null; nowMs: number },
): Promise<void> {
  await tx.insert(filing).values({
    id: newId(),
    recordingId,
    encounterId: place.id,
    patientId: place.patientId,
    by: 'person',
    sessionId: null,
    personId: by.personId,
    reason: by.reason,
    filedAt: by.nowMs,
  });
}
