import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { filing, recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { Identifiers } from './identifiers';
import { type Filed, insertPersonFiling, loadClip, loadTarget, subjectsOf } from './loadFiling';

export const Move = z.strictObject({
  encounterId: z.string().min(1).max(64),
  identifiers: Identifiers,
  reason: z.string().trim().min(5).max(500),
  /** Version of the recording that the page showed. */
  version: z.number().int(),
});
export type Move = z.infer<typeof Move>;

/**
 * Move a clip to another encounter, with a reason. The filing before is superseded and stays readable. The caller has
 * checked that the person may see both patients.
 *
 * @param number the recording's number
 * @throws Refusal `not-found`, `identifiers-mismatch`, `stale` (with `version`, `encounter`), `not-possible`
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
    if (clip.version !== wanted.version) throw stale(clip, current);
    const target = await loadTarget(tx, wanted.encounterId, wanted.identifiers);
    if (target.encounter.id === current.filing.encounterId)
      throw new Refusal('not-possible', `${clip.number} is filed there already.`);
    await tx
      .update(filing)
      .set({ supersededAt: now, supersededBy: by.id })
      .where(eq(filing.id, current.filing.id));
    await insertPersonFiling(tx, clip.id, target.encounter, {
      personId: by.id,
      reason: wanted.reason,
      nowMs: now,
    });
    await tx
      .update(recording)
      .set({ filedAt: now, version: clip.version + 1 })
      .where(eq(recording.id, clip.id));
    await appendEntries(tx, now, [
      {
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
          identifiers: 2,
          // A reading signed for the patient before would have to be looked at again.
          readingSigned: false,
        },
      },
    ]);
    const answer = { recording: clip.number, encounter: target.encounter.number };
    await remember?.(tx, answer);
    // Durable when this transaction commits: old filing ended, new one begun, entry written. Died before: nothing moved.
    return answer;
  });
}

function stale(
  clip: { number: string; version: number },
  current: { encounterNumber: string; person: string | null },
): Refusal {
  const who = current.person ? ` by ${current.person}` : '';
  return new Refusal(
    'stale',
    `${clip.number} was changed in the meantime: it is filed to ${current.encounterNumber}${who} now.`,
    { version: clip.version, encounter: current.encounterNumber },
  );
}
