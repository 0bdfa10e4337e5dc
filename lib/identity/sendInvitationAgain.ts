import { and, eq } from 'drizzle-orm';
import { invitation } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { INVITATION_LIVES_MS } from './invitePerson';
import { invitationLetter } from './letters';
import { isOpen, rolesOf } from './readInvitation';
import { tokenHash } from './tokenHash';
import { notOpen } from './withdrawInvitation';

/**
 * Send an open invitation once more, for another seven days. The address in the mail before stops working.
 *
 * @throws Refusal `not-possible`, `not-found`
 */
export async function sendInvitationAgain(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  by: Authorized<'people.write'>,
  id: string,
  remember?: (tx: Tx, answer: { expiresAt: number }) => Promise<void>,
): Promise<{ expiresAt: number }> {
  const now = services.clock.now();
  const token = newSecret();
  const answer = { expiresAt: now + INVITATION_LIVES_MS };
  return await services.write(async (tx) => {
    const [row] = await tx
      .update(invitation)
      .set({ ...answer, tokenHash: tokenHash(token) })
      .where(and(eq(invitation.id, id), isOpen(now)))
      .returning();
    if (!row) throw await notOpen(tx, id);
    await appendEntries(tx, now, [
      {
        kind: 'person-invited',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'invitation', id }],
        detail: { name: row.name, roles: rolesOf(row.roles), again: true },
      },
    ]);
    const to = { email: row.email, name: row.name, roles: rolesOf(row.roles) };
    await enqueueMail(tx, now, invitationLetter(services, to, by.name, token));
    await remember?.(tx, answer);
    return answer;
  });
}
