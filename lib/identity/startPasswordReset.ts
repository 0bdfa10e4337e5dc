import { and, eq, gt, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { passwordReset, signInTry, user } from '@/db/schema';
import { enqueueMail } from '@/lib/mail/enqueue';
import { newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { resetLetter } from './letters';
import { tokenHash } from './tokenHash';

export const ResetWish = z.strictObject({
  email: z.string().trim().toLowerCase().max(254).pipe(z.email()),
});

const LIVES_MS = 3_600_000;
const MOST_AN_HOUR = 3;

/**
 * Mail somebody a way to a new password, at most three an hour. Whether there is such an account shows neither in the
 * answer nor in its time: both ways end in one durable write.
 */
export async function startPasswordReset(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
  wish: z.infer<typeof ResetWish>,
): Promise<void> {
  const now = services.clock.now();
  const token = newSecret();
  const [person] = await services.read
    .select({ id: user.id, email: user.email })
    .from(user)
    .where(and(eq(user.email, wish.email), isNull(user.leftAt)))
    .limit(1);
  await services.write(async (tx) => {
    const recent = person
      ? await tx
          .select({ at: passwordReset.createdAt })
          .from(passwordReset)
          .where(and(eq(passwordReset.personId, person.id), gt(passwordReset.createdAt, now - 3_600_000)))
      : [];
    if (person && recent.length < MOST_AN_HOUR) {
      await tx.insert(passwordReset).values({
        tokenHash: tokenHash(token),
        personId: person.id,
        createdAt: now,
        expiresAt: now + LIVES_MS,
      });
      await enqueueMail(tx, now, resetLetter(services, person.email, token));
      return;
    }
    await tx
      .insert(signInTry)
      .values({ key: 'nobody', wrong: 1, lastAt: now, waitUntil: 0 })
      .onConflictDoUpdate({ target: signInTry.key, set: { lastAt: now } });
  });
}
