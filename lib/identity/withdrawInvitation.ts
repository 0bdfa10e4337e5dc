import { and, eq } from 'drizzle-orm';
import { invitation } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { isOpen } from './readInvitation';

/** @throws Refusal `not-possible` when it was taken up, was withdrawn before, or has ended */
export async function withdrawInvitation(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'people.write'>,
  id: string,
  remember?: (tx: Tx, answer: { id: string }) => Promise<void>,
): Promise<{ id: string }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [withdrawn] = await tx
      .update(invitation)
      .set({ withdrawnAt: now })
      .where(and(eq(invitation.id, id), isOpen(now)))
      .returning({ name: invitation.name });
    if (!withdrawn) throw await notOpen(tx, id);
    await appendEntries(tx, now, [
      {
        kind: 'invitation-withdrawn',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'invitation', id }],
        detail: { name: withdrawn.name },
      },
    ]);
    await remember?.(tx, { id });
    return { id };
  });
}

/** Why an invitation is not open any more. */
export async function notOpen(tx: Tx, id: string): Promise<Refusal> {
  const [row] = await tx.select().from(invitation).where(eq(invitation.id, id)).limit(1);
  if (!row) return new Refusal('not-found');
  const what =
    row.acceptedAt !== null
      ? 'was taken up'
      : row.withdrawnAt !== null
        ? 'was withdrawn already'
        : 'has ended by itself';
  return new Refusal('not-possible', `The invitation of ${row.name} ${what}.`);
}
