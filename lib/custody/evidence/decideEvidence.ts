import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { evidenceRequest, recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { appendEntries } from '../append';

export const DecideEvidence = z.strictObject({ approve: z.boolean() });

/**
 * Approve or refuse what somebody else asked for.
 *
 * @throws Refusal `not-found`, `not-possible` for one's own request, `stale` where it was decided already
 */
export async function decideEvidence(
  services: Pick<Services, 'write' | 'clock'>,
  person: Authorized<'evidence.make'>,
  id: string,
  body: z.infer<typeof DecideEvidence>,
  remember: (tx: Tx, answer: { decision: string }) => Promise<void>,
): Promise<{ decision: string }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [found] = await tx
      .select({ request: evidenceRequest, number: recording.number })
      .from(evidenceRequest)
      .innerJoin(recording, eq(recording.id, evidenceRequest.recordingId))
      .where(eq(evidenceRequest.id, id))
      .limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.request.askedBy === person.id)
      throw new Refusal('not-possible', 'Somebody else has to decide what you asked for.');
    if (found.request.decision !== null)
      throw new Refusal('stale', `It was decided already: ${found.request.decision}.`);
    const decision = body.approve ? ('approved' as const) : ('refused' as const);
    await tx
      .update(evidenceRequest)
      .set({ decision, decidedBy: person.id, decidedAt: now })
      .where(eq(evidenceRequest.id, id));
    await appendEntries(tx, now, [
      {
        kind: 'evidence-decided',
        actor: personActor(person, 'evidence.make'),
        subjects: [{ kind: 'recording', id: found.request.recordingId }],
        detail: { number: found.number, request: id, decision, reason: found.request.reason },
      },
    ]);
    const answer = { decision };
    await remember(tx, answer);
    return answer;
  });
}
