import { timingSafeEqual } from 'node:crypto';
import { and, eq, isNull } from 'drizzle-orm';
import { errors } from 'jose';
import { account, invitation, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { readConnection } from '@/lib/platform/connectionSetting';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import { OutsideError } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';
import { joinByInvitation } from '../acceptInvitation';
import type { Peer } from '../callAuth';
import { noteSignedIn } from '../noteSignedIn';
import { openSession } from '../openSession';
import { hasPasskey } from '../passkeys/passkeysOf';
import { isOpen } from '../readInvitation';
import type { SignInStep } from '../signIn';
import { takeAttempt } from '../signInAttempt';
import { discover } from './discovery';
import { type ProvenIdentity, readIdentity } from './readIdentity';

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log' | 'secrets'>;

const PROVIDER = 'single-sign-on';

export interface Callback {
  /** What the browser's cookie holds. */
  handle: string | null;
  code: string | undefined;
  state: string | undefined;
  /** RFC 9207. */
  iss: string | undefined;
}

const refused = (cause: unknown) =>
  new Refusal(
    'sign-in-refused',
    'The hospital’s account did not sign you in here. If you were never invited, ask your IT department.',
    {},
    { cause },
  );

const same = (a: string, b: string) =>
  a.length === b.length && timingSafeEqual(Buffer.from(a), Buffer.from(b));

/**
 * The browser comes back from the provider: whoever it is signs in, if we know them. Strangers, people who left,
 * unverified addresses and everything that does not fit together are answered alike.
 *
 * @returns where to go on, and how far the sign-in is
 * @throws Refusal `sign-in-refused`
 */
export async function finishSignOn(
  services: Needs,
  peer: Peer,
  callback: Callback,
): Promise<SignInStep & { address: string }> {
  const begun = callback.handle ? await takeAttempt(services, 'single-sign-on', callback.handle) : null;
  if (!begun || !callback.state || !same(callback.state, String(begun.state))) throw refused('state');
  if (!callback.code) throw refused('no code');
  const { identity, believed } = await identityOf(services, begun, callback.code, callback.iss);
  const personId = await services.write((tx) => personOf(tx, services.clock.now(), identity));
  if (!personId) throw refused('nobody we know');
  const address = String(begun.next);
  const passed = believed && identity.secondFactor;
  const [row] = await services.read
    .select({ on: user.twoFactorEnabled })
    .from(user)
    .where(eq(user.id, personId))
    .limit(1);
  if (!passed && row?.on !== true && (await hasPasskey(services, personId)))
    return { next: 'passkey', cookies: [], address };
  const step = await openSession(services, peer, personId, passed);
  if (step.next === 'in') await noteSignedIn(services, personId, passed ? 'provider' : null);
  return { ...step, address };
}

async function identityOf(
  services: Needs,
  begun: Record<string, unknown>,
  code: string,
  iss: string | undefined,
): Promise<{ identity: ProvenIdentity; believed: boolean }> {
  const found = await readConnection(services, 'single-sign-on');
  if (!found || found.settings.issuer !== begun.issuer) throw refused('another provider is set by now');
  try {
    const provider = await discover(services.env, found.settings.issuer);
    // RFC 9207, 2.4: an answer of another provider is not taken for this one's.
    const saysIss = provider.authorization_response_iss_parameter_supported === true;
    if (iss === undefined ? saysIss : iss !== provider.issuer) throw refused('iss');
    const identity = await readIdentity(services, {
      ...found,
      provider,
      code,
      verifier: String(begun.verifier),
      nonce: String(begun.nonce),
    });
    return { identity, believed: found.settings.providerSecondFactor };
  } catch (error) {
    if (error instanceof OutsideError || error instanceof errors.JOSEError || error instanceof SyntaxError)
      throw refused(error);
    throw error;
  }
}

/**
 * Whose identity this is: by the subject that was linked before, else by the verified address of somebody who is here
 * or holds an open invitation. One person has one subject at a provider: an address that was given to somebody else
 * there opens nothing here.
 */
async function personOf(tx: Tx, now: number, who: ProvenIdentity): Promise<string | null> {
  const subject = `${who.issuer} ${who.subject}`;
  const [linked] = await tx
    .select({ personId: account.userId, leftAt: user.leftAt })
    .from(account)
    .innerJoin(user, eq(user.id, account.userId))
    .where(and(eq(account.providerId, PROVIDER), eq(account.accountId, subject)))
    .limit(1);
  if (linked) return linked.leftAt === null ? linked.personId : null;
  if (who.email === null) return null;
  const [here] = await tx
    .select({ id: user.id })
    .from(user)
    .where(and(eq(user.email, who.email), isNull(user.leftAt)))
    .limit(1);
  const personId = here?.id ?? (await invited(tx, now, who.email));
  if (!personId) return null;
  const [other] = await tx
    .select({ id: account.id })
    .from(account)
    .where(and(eq(account.providerId, PROVIDER), eq(account.userId, personId)))
    .limit(1);
  if (other) return null;
  await link(tx, now, personId, who, subject);
  return personId;
}

async function invited(tx: Tx, now: number, email: string): Promise<string | null> {
  const [taken] = await tx
    .update(invitation)
    .set({ acceptedAt: now })
    .where(and(eq(invitation.email, email), isOpen(now)))
    .returning();
  return taken ? await joinByInvitation(tx, taken, now) : null;
}

async function link(
  tx: Tx,
  now: number,
  personId: string,
  who: ProvenIdentity,
  subject: string,
): Promise<void> {
  const at = new Date(now);
  await tx.insert(account).values({
    id: newId(),
    accountId: subject,
    providerId: PROVIDER,
    userId: personId,
    createdAt: at,
    updatedAt: at,
  });
  const [person] = await tx.select({ name: user.name }).from(user).where(eq(user.id, personId)).limit(1);
  await appendEntries(tx, now, [
    {
      kind: 'sign-on-linked',
      actor: { kind: 'person', id: personId, label: person?.name ?? '' },
      subjects: [{ kind: 'person', id: personId }],
      detail: { issuer: who.issuer },
    },
  ]);
}
