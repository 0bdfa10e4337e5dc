import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { Identifiers } from './identifiers';
import { type Filed, insertPersonFiling, loadClip, loadTarget, subjectsOf } from './loadFiling';

export const Filing = z.strictObject({ encounterId: z.string().min(1).max(64), identifiers: Identifiers });
export type Filing = z.infer<typeof Filing>;

const BY_ITSELF = {
  session: 'its listening session',
  identifier: 'the identifier that was scanned',
} as const;

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
      const { filing } = current;
      const who = filing.by === 'person' ? (current.person ?? 'somebody') : BY_ITSELF[filing.by];
      throw new Refusal(
        'already-filed',
        `${clip.number} was filed to ${current.encounterNumber} by ${who} already.`,
        { by: who, at: filing.filedAt, encounter: current.encounterNumber },
      );
    }
    const target = await loadTarget(tx, wanted.encounterId, wanted.identifiers);
    await insertPersonFiling(tx, clip.id, target.encounter, { personId: by.id, reason: null, nowMs: now });
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
    // Durable when this transaction commits, filing and entry together. Died before: the clip is in the tray as it was.
    // Died after: whoever asks again is told that it is filed, by whom and when.
    return answer;
  });
}
