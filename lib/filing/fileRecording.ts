import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { encounter, filing, patient, recording, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

/** Two identifiers, as read from the wristband or heard from the patient. Common practice, no source. */
export const Identifiers = z.strictObject({
  recordNumber: z.string().trim().min(1).max(64),
  /** Date of birth (YYYY-MM-DD) or family name. */
  second: z.string().trim().min(1).max(120),
});

export const Filing = z.strictObject({ encounterId: z.string().min(1).max(64), identifiers: Identifiers });
export type Filing = z.infer<typeof Filing>;

export const Move = z.strictObject({
  encounterId: z.string().min(1).max(64),
  identifiers: Identifiers,
  reason: z.string().trim().min(5).max(500),
  /** Number of the encounter that the page showed as the current one. */
  from: z.string(),
});
export type Move = z.infer<typeof Move>;

interface Filed {
  recording: string;
  encounter: string;
}

const plain = (text: string): string =>
  text
    .normalize('NFKD')
    .replace(/\p{M}/gu, '')
    .toLowerCase()
    .replace(/[^\p{L}\p{N}]/gu, '');

/** Whether the identifiers are this patient's, however they were spaced, cased or accented. */
export function identifiersMatch(
  given: z.infer<typeof Identifiers>,
  who: { recordNumber: string; familyName: string; birthDate: string | null },
): boolean {
  if (plain(given.recordNumber) !== plain(who.recordNumber)) return false;
  const second = plain(given.second);
  return second === plain(who.familyName) || (who.birthDate !== null && second === plain(who.birthDate));
}

async function loadTarget(tx: Tx, encounterId: string, identifiers: z.infer<typeof Identifiers>) {
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

async function loadClip(tx: Tx, number: string) {
  const [clip] = await tx.select().from(recording).where(eq(recording.number, number.toUpperCase())).limit(1);
  if (!clip || clip.stopped !== null) throw new Refusal('not-found');
  if (clip.stage !== 'measured' && clip.stage !== 'filed')
    throw new Refusal('not-possible', `${clip.number} is still on its way (${clip.stage}).`);
  const [current] = await tx
    .select({ filing, encounterNumber: encounter.number, who: user.name })
    .from(filing)
    .innerJoin(encounter, eq(encounter.id, filing.encounterId))
    .leftJoin(user, eq(user.id, filing.personId))
    .where(and(eq(filing.recordingId, clip.id), isNull(filing.supersededAt)))
    .limit(1);
  return { clip, current: current ?? null };
}

/**
 * File a stray clip to an encounter. Of two people who do it at once one wins, and the other is told who and when.
 * The caller has checked that the person may see the patient.
 *
 * @param number the recording's number
 * @throws Refusal `not-found`, `identifiers-mismatch`, `already-filed` (with `by`, `at`, `encounter`), `not-possible`
 */
export async function fileFromTray(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'filing.write'>,
  number: string,
  wanted: Filing,
  remember?: (tx: Tx, answer: Filed) => Promise<void>,
): Promise<Filed> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const { clip, current } = await loadClip(tx, number);
    if (current) {
      const who =
        current.who ??
        (current.filing.by === 'session' ? 'its listening session' : 'the identifier that was scanned');
      throw new Refusal(
        'already-filed',
        `${clip.number} was filed to ${current.encounterNumber} by ${who} already.`,
        { by: who, at: current.filing.filedAt, encounter: current.encounterNumber },
      );
    }
    const target = await loadTarget(tx, wanted.encounterId, wanted.identifiers);
    await insertPersonFiling(tx, clip.id, target.encounter, by.id, null, now);
    await tx
      .update(recording)
      .set({ stage: 'filed', filedAt: now, version: clip.version + 1 })
      .where(eq(recording.id, clip.id));
    await appendEntries(tx, now, [
      {
        kind: 'filed',
        actor: personActor(by, 'filing.write'),
        subjects: subjectsOf(clip, target.encounter),
        detail: { number: clip.number, encounter: target.encounter.number, by: 'person', identifiers: 2 },
      },
    ]);
    const answer = { recording: clip.number, encounter: target.encounter.number };
    await remember?.(tx, answer);
    return answer;
  });
}

/**
 * Move a clip to another encounter, with a reason. The filing before is superseded and stays readable.
 *
 * @throws Refusal `not-found`, `identifiers-mismatch`, `stale`, `not-possible`
 */
export async function moveFiling(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'filing.write'>,
  number: string,
  wanted: Move,
  remember?: (tx: Tx, answer: Filed) => Promise<void>,
): Promise<Filed> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const { clip, current } = await loadClip(tx, number);
    if (!current) throw new Refusal('not-possible', `${clip.number} is in the tray; file it from there.`);
    if (current.encounterNumber !== wanted.from) {
      throw new Refusal(
        'stale',
        `${clip.number} was moved to ${current.encounterNumber}${current.who ? ` by ${current.who}` : ''} in the meantime.`,
        { encounter: current.encounterNumber },
      );
    }
    const target = await loadTarget(tx, wanted.encounterId, wanted.identifiers);
    if (target.encounter.id === current.filing.encounterId)
      throw new Refusal('not-possible', `${clip.number} is filed there already.`);
    await tx
      .update(filing)
      .set({ supersededAt: now, supersededBy: by.id })
      .where(eq(filing.id, current.filing.id));
    await insertPersonFiling(tx, clip.id, target.encounter, by.id, wanted.reason, now);
    await tx
      .update(recording)
      .set({ filedAt: now, version: clip.version + 1 })
      .where(eq(recording.id, clip.id));
    const moved: NewEntry = {
      kind: 'filing-superseded',
      actor: personActor(by, 'filing.write'),
      subjects: [
        ...subjectsOf(clip, target.encounter),
        { kind: 'encounter', id: current.filing.encounterId },
        { kind: 'patient', id: current.filing.patientId },
      ],
      detail: {
        number: clip.number,
        from: current.encounterNumber,
        to: target.encounter.number,
        reason: wanted.reason,
      },
    };
    await appendEntries(tx, now, [moved]);
    const answer = { recording: clip.number, encounter: target.encounter.number };
    await remember?.(tx, answer);
    return answer;
  });
}

const subjectsOf = (clip: { id: string; deviceId: string }, place: { id: string; patientId: string }) => [
  { kind: 'recording' as const, id: clip.id },
  { kind: 'encounter' as const, id: place.id },
  { kind: 'patient' as const, id: place.patientId },
  { kind: 'device' as const, id: clip.deviceId },
];

async function insertPersonFiling(
  tx: Tx,
  recordingId: string,
  place: { id: string; patientId: string },
  personId: string,
  reason: string | null,
  now: number,
) {
  await tx.insert(filing).values({
    id: newId(),
    recordingId,
    encounterId: place.id,
    patientId: place.patientId,
    by: 'person',
    sessionId: null,
    personId,
    reason,
    filedAt: now,
  });
}
