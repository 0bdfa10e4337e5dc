import { createHmac } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { usedCode, verification } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { callAuth, cookieValue, type Peer } from './callAuth';
import { noteSignedIn } from './noteSignedIn';
import { type SignInStep, waitRefusal } from './signIn';

export const AuthenticatorCode = z.strictObject({
  code: z
    .string()
    .transform((code) => code.replace(/\s/g, ''))
    .pipe(z.string().regex(/^\d{6}$/, 'six digits')),
});
export const RecoveryCode = z.strictObject({ code: z.string().trim().min(1).max(40) });

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** A code is accepted up to one period of 30 s before and after its own. */
const CODE_LIVES_MS = 120_000;
const CHALLENGE_COOKIE = '.two_factor';

/**
 * Second step of a sign-in: a code of the authenticator (RFC 6238), or a recovery code, which works once.
 *
 * @throws Refusal `sign-in-refused`, `too-many-requests`
 */
export async function passSecondFactor(
  services: Needs,
  peer: Peer,
  factor: 'authenticator' | 'recovery-code',
  code: string,
): Promise<SignInStep> {
  const personId = await challenged(services, peer);
  if (!personId) throw startAgain('Too much time went by. Start again with your password.');
  if (factor === 'authenticator' && !(await claimCode(services, personId, code)))
    throw new Refusal('sign-in-refused', 'This code was used already. Wait for the next one.');
  const path = factor === 'authenticator' ? '/two-factor/verify-totp' : '/two-factor/verify-backup-code';
  const answer = await callAuth(services, peer, path, { code }, { cookies: CHALLENGE_COOKIE });
  if (answer.status === 200) {
    await noteSignedIn(services, personId, factor);
    return { next: 'in', cookies: answer.cookies };
  }
  if (answer.status >= 500) throw new Error(`the second factor answered ${answer.status}`);
  await services.write((tx) =>
    appendEntries(tx, services.clock.now(), [
      {
        kind: 'sign-in-refused',
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'person', id: personId }],
        detail: { factor },
      },
    ]),
  );
  if (answer.status === 429) throw waitRefusal(answer.retryAfterSeconds ?? 900);
  if (answer.body.code === 'TOO_MANY_ATTEMPTS_REQUEST_NEW_CODE')
    throw startAgain('Too many wrong codes. Start again with your password.');
  throw new Refusal('sign-in-refused', 'That code is not right.');
}

const startAgain = (sentence: string) => new Refusal('sign-in-refused', sentence, { startAgain: true });

/** Whose second step this is. The cookie's signature is checked with the code itself. */
async function challenged(services: Needs, peer: Peer): Promise<string | null> {
  const identifier = cookieValue(peer.headers, CHALLENGE_COOKIE);
  if (!identifier?.startsWith('2fa-') || identifier.startsWith('2fa-attempts-')) return null;
  const [row] = await services.read
    .select({ personId: verification.value })
    .from(verification)
    .where(eq(verification.identifier, identifier))
    .limit(1);
  return row?.personId ?? null;
}

/** RFC 6238, 5.2: a code is not accepted twice. @returns false when it was entered before */
export async function claimCode(services: Needs, personId: string, code: string): Promise<boolean> {
  const key = createHmac('sha256', services.env.BELLKEEP_AUTH_SECRET)
    .update(`code\0${personId}\0${code}`)
    .digest('hex');
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [before] = await tx.select().from(usedCode).where(eq(usedCode.key, key)).limit(1);
    if (before && before.expiresAt > now) return false;
    const expiresAt = now + CODE_LIVES_MS;
    await tx
      .insert(usedCode)
      .values({ key, expiresAt })
      .onConflictDoUpdate({ target: usedCode.key, set: { expiresAt } });
    return true;
  });
}
