import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { session, signInTry, user } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { callAuth, type Peer, sessionToken } from './callAuth';
import { noteSignedIn } from './noteSignedIn';
import { hasPasskey } from './passkeys/passkeysOf';
import { deleteSessions } from './sessions';
import { takeTry, tryWasRight } from './signInLimits';

export const SignIn = z.strictObject({
  email: z.string().trim().toLowerCase().max(254).pipe(z.email()),
  password: z.string().min(1).max(1024),
});
export type SignIn = z.infer<typeof SignIn>;

export interface SignInStep {
  /** `passkey`: the password was right, and whoever holds it shows a passkey instead of a code. */
  next: 'in' | 'second-factor' | 'passkey';
  /** Set-Cookie lines for the browser. */
  cookies: string[];
}

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** Why one has to wait, as a refusal with its field. */
export const waitRefusal = (seconds: number): Refusal =>
  new Refusal(
    'too-many-requests',
    `Too many wrong tries. Try again in ${seconds < 90 ? `${seconds} seconds` : `${Math.ceil(seconds / 60)} minutes`}.`,
    {},
    { headers: { 'retry-after': String(seconds) } },
  );

/**
 * Check e-mail and password. Unknown accounts, wrong passwords and people who left get the same answer in the same time.
 *
 * @throws Refusal `sign-in-refused`, `too-many-requests`
 */
export async function signIn(services: Needs, peer: Peer, wanted: SignIn): Promise<SignInStep> {
  const wait = await takeTry(services, wanted.email, peer.address);
  if (wait > 0) throw waitRefusal(wait);
  // An old session goes along with nothing: a new one gets an id of its own.
  const answer = await callAuth(services, peer, '/sign-in/email', { ...wanted }, { cookies: null });
  if (answer.status === 429) throw waitRefusal(answer.retryAfterSeconds ?? 60);
  if (answer.status >= 500) throw new Error(`sign-in answered ${answer.status}`);
  if (answer.status !== 200) {
    await noteRefused(services, wanted.email);
    throw new Refusal('sign-in-refused');
  }
  await tryWasRight(services, wanted.email, peer.address);
  if (answer.body.twoFactorRedirect === true) return { next: 'second-factor', cookies: answer.cookies };
  const personId = (answer.body.user as { id: string }).id;
  if (await hasPasskey(services, personId)) {
    // Nobody gets the cookie of this session: with a passkey and no authenticator the passkey is the second factor.
    await services.write((tx) =>
      deleteSessions(tx, personId, eq(session.token, sessionToken(answer.cookies))),
    );
    return { next: 'passkey', cookies: [] };
  }
  await noteSignedIn(services, personId, null);
  return { next: 'in', cookies: answer.cookies };
}

/**
 * Only tries for accounts that exist are entries: an address that somebody mistyped is nobody's business. Both ways
 * end in one durable write, so that they take the same time.
 */
async function noteRefused(services: Needs, email: string): Promise<void> {
  const [person] = await services.read
    .select({ id: user.id })
    .from(user)
    .where(eq(user.email, email))
    .limit(1);
  const now = services.clock.now();
  await services.write(async (tx) => {
    if (person) {
      await appendEntries(tx, now, [
        { kind: 'sign-in-refused', actor: SERVICE_ACTOR, subjects: [{ kind: 'person', id: person.id }] },
      ]);
    } else {
      await tx
        .insert(signInTry)
        .values({ key: 'nobody', wrong: 1, lastAt: now, waitUntil: 0 })
        .onConflictDoUpdate({ target: signInTry.key, set: { lastAt: now } });
    }
  });
}
