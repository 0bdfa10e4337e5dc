import {
  type AuthenticationResponseJSON,
  type AuthenticatorTransport,
  generateAuthenticationOptions,
  type PublicKeyCredentialRequestOptionsJSON,
  verifyAuthenticationResponse,
} from '@simplewebauthn/server';
import { and, eq } from 'drizzle-orm';
import { z } from 'zod';
import { passkey } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import type { Peer } from '../callAuth';
import { noteSignedIn } from '../noteSignedIn';
import { openSession } from '../openSession';
import type { SignInStep } from '../signIn';
import { keepAttempt, takeAttempt } from '../signInAttempt';
import { BrowserAnswer } from './addPasskey';
import { relyingParty } from './passkeysOf';

export const PasskeySignIn = z.strictObject({ handle: z.string().min(1).max(100), answer: BrowserAnswer });

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log' | 'secrets'>;

/** What a browser is asked to sign; it finds the passkey itself, so nobody is named. */
export async function beginPasskeySignIn(
  services: Needs,
): Promise<{ handle: string; options: PublicKeyCredentialRequestOptionsJSON }> {
  const options = await generateAuthenticationOptions({
    rpID: relyingParty(services).id,
    userVerification: 'required',
  });
  const handle = await keepAttempt(services, 'passkey-sign-in', { challenge: options.challenge });
  return { handle, options };
}

const refused = () => new Refusal('sign-in-refused', 'This passkey does not open anything here.');

/**
 * Sign in with a passkey: possession and the person's PIN or finger in one, so no code is asked for. Unknown, removed
 * and wrong ones are answered alike.
 *
 * @throws Refusal `sign-in-refused`
 */
export async function signInByPasskey(
  services: Needs,
  peer: Peer,
  wanted: z.infer<typeof PasskeySignIn>,
): Promise<SignInStep> {
  const begun = await takeAttempt(services, 'passkey-sign-in', wanted.handle);
  if (!begun) throw new Refusal('sign-in-refused', 'Too much time went by. Try again.');
  const [row] = await services.read.select().from(passkey).where(eq(passkey.id, wanted.answer.id)).limit(1);
  if (!row) throw refused();
  const party = relyingParty(services);
  const checked = await verifyAuthenticationResponse({
    response: wanted.answer as unknown as AuthenticationResponseJSON,
    expectedChallenge: String(begun.challenge),
    expectedOrigin: party.origin,
    expectedRPID: party.id,
    requireUserVerification: true,
    credential: {
      id: row.id,
      publicKey: new Uint8Array(row.publicKey),
      counter: row.counter,
      transports: row.transports.split(',').filter(Boolean) as AuthenticatorTransport[],
    },
  }).catch(() => null);
  const moved =
    checked?.verified === true && (await noteUse(services, row, checked.authenticationInfo.newCounter));
  if (!moved) {
    await services.write((tx) =>
      appendEntries(tx, services.clock.now(), [
        {
          kind: 'sign-in-refused',
          actor: SERVICE_ACTOR,
          subjects: [{ kind: 'person', id: row.personId }],
          detail: { factor: 'passkey' },
        },
      ]),
    );
    throw refused();
  }
  const step = await openSession(services, peer, row.personId, true);
  await noteSignedIn(services, row.personId, 'passkey');
  return step;
}

/** A counter that stands where it stood when it was read: of two answers with one counter, one counts. */
async function noteUse(
  services: Needs,
  row: typeof passkey.$inferSelect,
  newCounter: number,
): Promise<boolean> {
  return await services.write(async (tx) => {
    const moved = await tx
      .update(passkey)
      .set({ counter: newCounter, lastUsedAt: services.clock.now() })
      .where(and(eq(passkey.id, row.id), eq(passkey.counter, row.counter)))
      .returning({ id: passkey.id });
    return moved.length > 0;
  });
}
