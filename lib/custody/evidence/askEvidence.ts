import { desc, eq } from 'drizzle-orm';
import { z } from 'zod';
import { evidencePolicy, evidenceRequest, recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { appendEntries } from '../append';

export const AskEvidence = z.strictObject({ reason: z.string().trim().min(5).max(500) });

export interface EvidenceAnswer {
  id: string;
  /** `waiting` for a second person, or `open` to be taken away. */
  state: 'waiting' | 'open';
}

/** Whether policy asks for a second person. */
async function needsSecondPerson(tx: Tx): Promise<boolean> {
  const [row] = await tx.select().from(evidencePolicy).orderBy(desc(evidencePolicy.version)).limit(1);
  return row?.secondPerson ?? false;
}

/**
 * Ask for a recording's evidence, with a reason. Where policy asks for no second person it is open at once.
 *
 * @throws Refusal `not-found`, `not-possible` for a recording that is not sealed
 */
export async function askEvidence(
  services: Pick<Services, 'write' | 'clock'>,
  person: Authorized<'evidence.make'>,
  number: string,
  body: z.infer<typeof AskEvidence>,
  remember: (tx: Tx, answer: EvidenceAnswer) => Promise<void>,
): Promise<EvidenceAnswer> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [found] = await tx
      .select({ id: recording.id, number: recording.number, sealedAt: recording.sealedAt })
      .from(recording)
      .where(eq(recording.number, number.toUpperCase()))
      .limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.sealedAt === null)
      throw new Refusal('not-possible', 'The recording is not sealed: there is nothing to prove yet.');
    const second = await needsSecondPerson(tx);
    const id = newId();
    await tx.insert(evidenceRequest).values({
      id,
      recordingId: found.id,
      reason: body.reason,
      askedBy: person.id,
      askedAt: now,
      decision: second ? null : 'not-needed',
      decidedAt: second ? null : now,
    });
    await appendEntries(tx, now, [
      {
        kind: 'evidence-asked',
        actor: personActor(person, 'evidence.make'),
        subjects: [{ kind: 'recording', id: found.id }],
        detail: { number: found.number, request: id, reason: body.reason, secondPerson: second },
      },
    ]);
    const answer: EvidenceAnswer = { id, state: second ? 'waiting' : 'open' };
    await remember(tx, answer);
    return answer;
  });
}
