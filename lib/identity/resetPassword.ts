import { and, eq, gt, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { passwordReset, user } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { checkNewPassword } from './changePassword';
import { noticeLetter } from './letters';
import { hashPassword } from './password';
import { deleteSessions } from './sessions';
import { storePassword } from './storePassword';
import { tokenHash } from './tokenHash';

export const NewPassword = z.strictObject({
  token: z.string().min(1).max(200),
  newPassword: z.string().min(1).max(1024),
});

const notOpen = () =>
  new Refusal('not-found', 'This address does not work any more: it was used, or its hour is over.');

/**
 * Set a new password by the token that came by mail. It works once; all sessions of the person end, and the second
 * factor stays what it was.
 *
 * @throws Refusal `not-found`, `body-invalid`
 */
export async function resetPassword(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
  wanted: z.infer<typeof NewPassword>,
): Promise<void> {
  const hash = tokenHash(wanted.token);
  const now = services.clock.now();
  const isOpen = and(
    eq(passwordReset.tokenHash, hash),
    isNull(passwordReset.usedAt),
    gt(passwordReset.expiresAt, now),
  );
  const [person] = await services.read
    .select({ id: user.id, name: user.name, email: user.email })
    .from(passwordReset)
    .innerJoin(user, eq(user.id, passwordReset.personId))
    .where(and(isOpen, isNull(user.leftAt)))
    .limit(1);
  if (!person) throw notOpen();
  checkNewPassword(services, wanted.newPassword, person, 'newPassword');
  const password = await hashPassword(wanted.newPassword);
  await services.write(async (tx) => {
    // Of two at the same moment the second finds nothing open here.
    const used = await tx
      .update(passwordReset)
      .set({ usedAt: now })
      .where(isOpen)
      .returning({ personId: passwordReset.personId });
    if (used.length === 0) throw notOpen();
    await tx
      .update(passwordReset)
      .set({ usedAt: now })
      .where(and(eq(passwordReset.personId, person.id), isNull(passwordReset.usedAt)));
    await storePassword(tx, person.id, password, now);
    const sessionsEnded = await deleteSessions(tx, person.id);
    await appendEntries(tx, now, [
      {
        kind: 'password-reset',
        actor: { kind: 'person', id: person.id, label: person.name },
        subjects: [{ kind: 'person', id: person.id }],
        detail: { how: 'by mail', sessionsEnded },
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, person.email, 'password-changed'));
  });
}
