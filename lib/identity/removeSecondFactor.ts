import { eq, ne } from 'drizzle-orm';
import { z } from 'zod';
import { passkey, session, twoFactor, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { checkOwnPassword } from './changePassword';
import { findPerson } from './findPerson';
import { noticeLetter } from './letters';
import { deleteSessions } from './sessions';

export const Removal = z.strictObject({ reason: z.string().trim().min(5).max(500) });

/**
 * Take away the second factor of somebody who lost both authenticator and recovery codes, with their passkeys. Their sessions end, they are
 * told by mail, and where the role asks for one they set up another before anything else.
 *
 * @throws Refusal `not-found`, `not-possible` for oneself and where there is none
 */
export async function removeSecondFactor(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  by: Authorized<'people.write'>,
  personId: string,
  reason: string,
  remember?: (tx: Tx, answer: { sessionsEnded: number }) => Promise<void>,
): Promise<{ sessionsEnded: number }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const person = await findPerson(tx, personId);
    if (person.id === by.id) throw new Refusal('not-possible', 'Change your own on your account page.');
    const gone = await tx
      .delete(twoFactor)
      .where(eq(twoFactor.userId, personId))
      .returning({ id: twoFactor.id });
    const keys = await tx.delete(passkey).where(eq(passkey.personId, personId)).returning({ id: passkey.id });
    if (gone.length + keys.length === 0)
      throw new Refusal('not-possible', `${person.name} has no second factor.`);
    await tx
      .update(user)
      .set({ twoFactorEnabled: false, updatedAt: new Date(now) })
      .where(eq(user.id, personId));
    const answer = { sessionsEnded: await deleteSessions(tx, personId) };
    await appendEntries(tx, now, [
      {
        kind: 'second-factor-removed',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'person', id: personId }],
        detail: { name: person.name, reason, sessionsEnded: answer.sessionsEnded },
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, person.email, 'second-factor-removed'));
    await remember?.(tx, answer);
    return answer;
  });
}

/**
 * Take away one's own second factor, to set up another or to do without where the role allows it. Sessions elsewhere
 * end.
 *
 * @throws Refusal `body-invalid` for a wrong password, `not-possible` where there is none
 */
export async function removeOwnSecondFactor(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
  by: Authorized<'self'>,
  password: string,
): Promise<void> {
  await checkOwnPassword(services, by, password, 'password');
  const now = services.clock.now();
  await services.write(async (tx) => {
    const gone = await tx
      .delete(twoFactor)
      .where(eq(twoFactor.userId, by.id))
      .returning({ id: twoFactor.id });
    if (gone.length === 0) throw new Refusal('not-possible', 'There is no second factor.');
    await tx
      .update(user)
      .set({ twoFactorEnabled: false, updatedAt: new Date(now) })
      .where(eq(user.id, by.id));
    await deleteSessions(tx, by.id, ne(session.id, by.sessionId));
    await appendEntries(tx, now, [
      {
        kind: 'second-factor-removed',
        actor: personActor(by, 'self'),
        subjects: [{ kind: 'person', id: by.id }],
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, by.email, 'second-factor-removed'));
  });
}
