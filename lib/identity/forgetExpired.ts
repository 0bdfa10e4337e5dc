import { and, isNotNull, lt } from 'drizzle-orm';
import {
  idempotencyKey,
  outbox,
  passwordReset,
  rateLimit,
  session,
  signInAttempt,
  signInTry,
  usedCode,
  verification,
} from '@/db/schema';
import type { Services } from '@/lib/platform/services';

const DAY_MS = 86_400_000;

/**
 * Remove what has ended and is of no use to anybody: sessions, challenges, tries, codes, resets, answers kept for
 * repeats, work done. Nothing of it is evidence. Safe to run in several processes.
 */
export async function forgetExpired(services: Pick<Services, 'write' | 'clock'>): Promise<void> {
  const now = services.clock.now();
  await services.write(async (tx) => {
    await tx.delete(session).where(lt(session.expiresAt, new Date(now)));
    await tx.delete(verification).where(lt(verification.expiresAt, new Date(now)));
    await tx.delete(rateLimit).where(lt(rateLimit.lastRequest, now - DAY_MS));
    await tx.delete(signInTry).where(lt(signInTry.lastAt, now - 2 * DAY_MS));
    await tx.delete(signInAttempt).where(lt(signInAttempt.expiresAt, now));
    await tx.delete(usedCode).where(lt(usedCode.expiresAt, now));
    await tx.delete(passwordReset).where(lt(passwordReset.expiresAt, now - DAY_MS));
    await tx.delete(idempotencyKey).where(lt(idempotencyKey.createdAt, now - 2 * DAY_MS));
    await tx.delete(outbox).where(and(isNotNull(outbox.doneAt), lt(outbox.doneAt, now - 30 * DAY_MS)));
  });
}
