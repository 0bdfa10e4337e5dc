import { and, eq, isNull, ne } from 'drizzle-orm';
import { z } from 'zod';
import { account, passwordReset, session } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { noticeLetter } from './letters';
import { hashPassword, passwordProblem, verifyPassword } from './password';
import { deleteSessions } from './sessions';
import { waitRefusal } from './signIn';
import { takeTry, tryWasRight } from './signInLimits';

export const PasswordChange = z.strictObject({
  current: z.string().min(1).max(1024),
  fresh: z.string().min(1).max(1024),
});

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env'>;

/** @throws Refusal `body-invalid` naming the field, with the sentence of `passwordProblem` */
export function checkNewPassword(
  services: Pick<Services, 'env'>,
  password: string,
  person: { name: string; email: string },
  path: string,
): void {
  const problem = passwordProblem(password, [person.name, person.email, services.env.BELLKEEP_HOSPITAL]);
  if (problem) throw new Refusal('body-invalid', problem, { errors: [{ path, message: problem }] });
}

/** Whether somebody has a password: who came by single sign-on alone has none. */
export async function hasOwnPassword(
  services: Pick<Services, 'read'>,
  by: Pick<Authorized<'self'>, 'id'>,
): Promise<boolean> {
  const [row] = await services.read
    .select({ id: account.id })
    .from(account)
    .where(and(eq(account.userId, by.id), eq(account.providerId, 'credential')))
    .limit(1);
  return row !== undefined;
}

/**
 * Check somebody's own password again before something that a stolen session must not do. Wrong ones count and wait
 * like wrong sign-ins.
 *
 * @returns the stored hash that it matched
 * @throws Refusal `body-invalid` at `path`, `too-many-requests`
 */
export async function checkOwnPassword(
  services: Needs,
  by: Authorized<'self'>,
  password: string,
  path: string,
): Promise<string> {
  const wait = await takeTry(services, `again ${by.id}`, 'any');
  if (wait > 0) throw waitRefusal(wait);
  const [row] = await services.read
    .select({ password: account.password })
    .from(account)
    .where(and(eq(account.userId, by.id), eq(account.providerId, 'credential')))
    .limit(1);
  if (!row?.password || !(await verifyPassword(row.password, password)))
    throw new Refusal('body-invalid', 'The present password is not right.', {
      errors: [{ path, message: 'not right' }],
    });
  await tryWasRight(services, `again ${by.id}`, 'any');
  return row.password;
}

/**
 * Change one's own password. Sessions elsewhere end and mails on their way to set another one stop working.
 *
 * @throws Refusal `body-invalid`, `too-many-requests`, `stale` when it was changed at the same moment
 */
export async function changePassword(
  services: Needs,
  by: Authorized<'self'>,
  wanted: z.infer<typeof PasswordChange>,
): Promise<{ sessionsEnded: number }> {
  const before = await checkOwnPassword(services, by, wanted.current, 'current');
  checkNewPassword(services, wanted.fresh, by, 'fresh');
  const after = await hashPassword(wanted.fresh);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const changed = await tx
      .update(account)
      .set({ password: after, updatedAt: new Date(now) })
      .where(and(eq(account.userId, by.id), eq(account.password, before)))
      .returning({ id: account.id });
    if (changed.length === 0) throw new Refusal('stale', 'The password was changed in the meantime.');
    const sessionsEnded = await deleteSessions(tx, by.id, ne(session.id, by.sessionId));
    await tx
      .update(passwordReset)
      .set({ usedAt: now })
      .where(and(eq(passwordReset.personId, by.id), isNull(passwordReset.usedAt)));
    await appendEntries(tx, now, [
      {
        kind: 'password-reset',
        actor: personActor(by, 'self'),
        subjects: [{ kind: 'person', id: by.id }],
        detail: { how: 'changed', sessionsEnded },
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, by.email, 'password-changed'));
    return { sessionsEnded };
  });
}
