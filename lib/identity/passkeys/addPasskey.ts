import {
  generateRegistrationOptions,
  type PublicKeyCredentialCreationOptionsJSON,
  type RegistrationResponseJSON,
  verifyRegistrationResponse,
} from '@simplewebauthn/server';
import { eq, ne } from 'drizzle-orm';
import { z } from 'zod';
import { passkey, session } from '@/db/schema';
import { isUniqueViolation } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { enqueueMail } from '@/lib/mail/enqueue';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { checkOwnPassword, hasOwnPassword } from '../changePassword';
import { noticeLetter } from '../letters';
import { deleteSessions } from '../sessions';
import { keepAttempt, takeAttempt } from '../signInAttempt';
import { passkeysOf, relyingParty } from './passkeysOf';

const MOST = 10;
const FRESH_MS = 600_000;

export const PasskeyPlanRequest = z.strictObject({ password: z.string().min(1).max(1024).optional() });
/** What a browser made; the library checks every member, here only its shape. */
export const BrowserAnswer = z.looseObject({
  id: z.string().max(2000),
  rawId: z.string().max(2000),
  type: z.literal('public-key'),
  response: z.record(z.string(), z.unknown()),
  clientExtensionResults: z.record(z.string(), z.unknown()),
});
export const NewPasskey = z.strictObject({
  handle: z.string().min(1).max(100),
  name: z
    .string()
    .trim()
    .min(1, 'A name is needed.')
    .max(60)
    .regex(/^[^\p{C}]*$/u, 'It holds characters that cannot be seen.'),
  answer: BrowserAnswer,
});

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>;

/**
 * Somebody who has a password gives it again; who comes by single sign-on alone signed in a moment ago.
 *
 * @throws Refusal `body-invalid`
 */
export async function provePresence(
  services: Needs,
  by: Authorized<'self'>,
  password: string | undefined,
): Promise<void> {
  if (await hasOwnPassword(services, by)) {
    await checkOwnPassword(services, by, password ?? '', 'password');
    return;
  }
  const [current] = await services.read
    .select({ createdAt: session.createdAt })
    .from(session)
    .where(eq(session.id, by.sessionId))
    .limit(1);
  if (!current || services.clock.now() - current.createdAt.getTime() > FRESH_MS)
    throw new Refusal('body-invalid', 'Sign out and in again first.', {
      errors: [{ path: 'password', message: 'Sign out and in again first.' }],
    });
}

/**
 * Begin to add a passkey: what the browser is asked to make.
 *
 * @throws Refusal `body-invalid` for a wrong password, `not-possible` for one too many
 */
export async function beginPasskey(
  services: Needs,
  by: Authorized<'self'>,
  password: string | undefined,
): Promise<{ handle: string; options: PublicKeyCredentialCreationOptionsJSON }> {
  await provePresence(services, by, password);
  const held = await passkeysOf(services, by.id);
  if (held.length >= MOST) throw new Refusal('not-possible', `Nobody has more than ${MOST} passkeys.`);
  const party = relyingParty(services);
  const options = await generateRegistrationOptions({
    rpID: party.id,
    rpName: party.name,
    userID: new TextEncoder().encode(by.id),
    userName: by.email,
    userDisplayName: by.name,
    attestationType: 'none',
    excludeCredentials: held.map(({ id }) => ({ id })),
    authenticatorSelection: { residentKey: 'required', userVerification: 'required' },
  });
  const handle = await keepAttempt(services, 'passkey-add', { challenge: options.challenge }, by.id);
  return { handle, options };
}

const refused = (cause?: unknown) =>
  new Refusal('body-invalid', 'The browser’s passkey was not accepted. Begin again.', {}, { cause });

/**
 * Keep the passkey that the browser made. From here on it signs in, and counts as a second factor; sessions elsewhere
 * end. If the process dies before this commits, the browser holds a passkey that we do not know, and which is refused.
 *
 * @throws Refusal `body-invalid`
 */
export async function addPasskey(
  services: Needs,
  by: Authorized<'self'>,
  wanted: z.infer<typeof NewPasskey>,
): Promise<{ id: string }> {
  const begun = await takeAttempt(services, 'passkey-add', wanted.handle, by.id);
  if (!begun) throw refused('no such attempt');
  const party = relyingParty(services);
  const checked = await verifyRegistrationResponse({
    response: wanted.answer as unknown as RegistrationResponseJSON,
    expectedChallenge: String(begun.challenge),
    expectedOrigin: party.origin,
    expectedRPID: party.id,
    requireUserVerification: true,
  }).catch((error: unknown) => {
    throw refused(error);
  });
  if (!checked.verified) throw refused('not verified');
  const { credential, credentialBackedUp } = checked.registrationInfo;
  const now = services.clock.now();
  try {
    await services.write(async (tx) => {
      await tx.insert(passkey).values({
        id: credential.id,
        personId: by.id,
        name: wanted.name,
        publicKey: credential.publicKey,
        counter: credential.counter,
        transports: (credential.transports ?? []).join(','),
        backedUp: credentialBackedUp,
        createdAt: now,
      });
      await deleteSessions(tx, by.id, ne(session.id, by.sessionId));
      await appendEntries(tx, now, [
        {
          kind: 'passkey-added',
          actor: personActor(by, 'self'),
          subjects: [{ kind: 'person', id: by.id }],
          detail: { name: wanted.name },
        },
      ]);
      await enqueueMail(tx, now, noticeLetter(services, by.email, 'passkey-added'));
    });
  } catch (error) {
    if (isUniqueViolation(error)) throw refused('this passkey is kept already');
    throw error;
  }
  return { id: credential.id };
}
