import { eq, ne } from 'drizzle-orm';
import { z } from 'zod';
import { session, twoFactor, user } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { callAuth, type Peer, sessionToken } from './callAuth';
import { checkOwnPassword } from './changePassword';
import { noticeLetter } from './letters';
import { claimCode } from './passSecondFactor';
import { deleteSessions } from './sessions';
import { waitRefusal } from './signIn';

export const WithPassword = z.strictObject({ password: z.string().min(1).max(1024) });

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** Whether a second factor is asked for when this person signs in. */
export async function hasSecondFactor(
  services: Pick<Services, 'read'>,
  person: Pick<Authorized<'self'>, 'id'>,
): Promise<boolean> {
  const [row] = await services.read
    .select({ on: user.twoFactorEnabled })
    .from(user)
    .where(eq(user.id, person.id))
    .limit(1);
  return row?.on === true;
}

export interface SecondFactorPlan {
  /** `otpauth://totp/…` (key URI format of authenticators; common practice, no standard). Shown once. */
  uri: string;
  recoveryCodes: string[];
}

/**
 * Begin to set up an authenticator: a fresh secret and recovery codes, which count only when the first code was entered.
 *
 * @throws Refusal `body-invalid` for a wrong password, `not-possible` when there is one already, `too-many-requests`
 */
export async function beginSecondFactor(
  services: Needs,
  by: Authorized<'self'>,
  peer: Peer,
  password: string,
): Promise<SecondFactorPlan> {
  await checkOwnPassword(services, by, password, 'password');
  if (await hasSecondFactor(services, by))
    throw new Refusal('not-possible', 'There is an authenticator already. Remove it to set up another.');
  const answer = await callAuth(services, peer, '/two-factor/enable', { password });
  if (answer.status === 429) throw waitRefusal(answer.retryAfterSeconds ?? 60);
  if (answer.status !== 200) throw new Error(`setting up the second factor answered ${answer.status}`);
  return {
    uri: String(answer.body.totpURI),
    recoveryCodes: (answer.body.backupCodes as unknown[]).map(String),
  };
}

/**
 * The first code shows that the authenticator holds the secret: from here on it is asked for at every sign-in. The
 * session gets a new id and all others end.
 *
 * @returns Set-Cookie lines of the new session
 * @throws Refusal `body-invalid` for a wrong code, `not-possible` when nothing was begun
 */
export async function confirmSecondFactor(
  services: Needs,
  by: Authorized<'self'>,
  peer: Peer,
  code: string,
): Promise<{ cookies: string[] }> {
  const [begun] = await services.read
    .select({ verified: twoFactor.verified })
    .from(twoFactor)
    .where(eq(twoFactor.userId, by.id))
    .limit(1);
  if (begun?.verified !== false) throw new Refusal('not-possible', 'Begin again: nothing is being set up.');
  if (!(await claimCode(services, by.id, code)))
    throw wrongCode('This code was used. Wait for the next one.');
  const answer = await callAuth(services, peer, '/two-factor/verify-totp', { code });
  if (answer.status === 429) throw waitRefusal(answer.retryAfterSeconds ?? 60);
  if (answer.status === 401 || answer.status === 400) throw wrongCode('That code is not right.');
  if (answer.status !== 200) throw new Error(`the first code answered ${answer.status}`);
  // The factor counts from Better Auth's own write on. Dying here leaves it on and without its entry; the person has no
  // cookie then, signs in with it, and nothing was weakened.
  const now = services.clock.now();
  await services.write(async (tx) => {
    await deleteSessions(tx, by.id, ne(session.token, sessionToken(answer.cookies)));
    await appendEntries(tx, now, [
      {
        kind: 'second-factor-set',
        actor: personActor(by, 'self'),
        subjects: [{ kind: 'person', id: by.id }],
      },
    ]);
    await enqueueMail(tx, now, noticeLetter(services, by.email, 'second-factor-set'));
  });
  return { cookies: answer.cookies };
}

const wrongCode = (sentence: string) =>
  new Refusal('body-invalid', sentence, { errors: [{ path: 'code', message: sentence }] });

/**
 * Ten new recovery codes; those before stop working.
 *
 * @throws Refusal `body-invalid` for a wrong password, `not-possible` without a second factor
 */
export async function newRecoveryCodes(
  services: Needs,
  by: Authorized<'self'>,
  peer: Peer,
  password: string,
): Promise<{ recoveryCodes: string[] }> {
  await checkOwnPassword(services, by, password, 'password');
  const answer = await callAuth(services, peer, '/two-factor/generate-backup-codes', { password });
  if (answer.status === 429) throw waitRefusal(answer.retryAfterSeconds ?? 60);
  if (answer.status === 400) throw new Refusal('not-possible', 'There is no second factor yet.');
  if (answer.status !== 200) throw new Error(`new recovery codes answered ${answer.status}`);
  await services.write((tx) =>
    appendEntries(tx, services.clock.now(), [
      {
        kind: 'second-factor-set',
        actor: personActor(by, 'self'),
        subjects: [{ kind: 'person', id: by.id }],
        detail: { recoveryCodes: 'new' },
      },
    ]),
  );
  return { recoveryCodes: (answer.body.backupCodes as unknown[]).map(String) };
}
