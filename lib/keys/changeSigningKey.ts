import { and, eq, gt, inArray, isNotNull, isNull, notExists, sql } from 'drizzle-orm';
import { z } from 'zod';
import { credential, signingKey } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Actor, SERVICE_ACTOR } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { makeSigningKey, type SigningKeyRow } from './signingKeys';

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'secrets'>;

export const KeyChange = z.strictObject({
  /** The key that whoever decides was looking at: of two who rotate at once one is told. */
  kid: z.string().min(1).max(100),
  reason: z.string().trim().min(5, 'A reason of at least five letters is needed.').max(500),
});
export type KeyChange = z.infer<typeof KeyChange>;

interface Changed {
  kid: string;
  before: string;
}

const LIVING = ['issued', 'in-use', 'superseded'] as const;

/** Put a fresh key in the place of the current one, in the caller's transaction. */
async function replace(
  tx: Tx,
  fresh: SigningKeyRow,
  expected: string,
  now: number,
  actor: Actor,
  reason: string,
): Promise<SigningKeyRow> {
  const [current] = await tx
    .select()
    .from(signingKey)
    .where(and(eq(signingKey.use, fresh.use), isNull(signingKey.supersededAt), isNull(signingKey.retiredAt)))
    .limit(1);
  if (!current) throw new Refusal('not-found');
  if (current.kid !== expected)
    throw new Refusal('stale', 'Another key signs by now: somebody rotated it in the meantime.', {
      kid: current.kid,
    });
  await tx.update(signingKey).set({ supersededAt: now }).where(eq(signingKey.kid, current.kid));
  await tx.insert(signingKey).values(fresh);
  await appendEntries(tx, now, [
    {
      kind: 'signing-key-superseded',
      actor,
      subjects: [
        { kind: 'signing-key', id: current.kid },
        { kind: 'signing-key', id: fresh.kid },
      ],
      detail: { use: fresh.use, reason },
    },
    {
      kind: 'signing-key-made',
      actor,
      subjects: [{ kind: 'signing-key', id: fresh.kid }],
      detail: { use: fresh.use, algorithm: fresh.algorithm, publicJwk: JSON.parse(fresh.publicJwk) },
    },
  ]);
  return current;
}

/**
 * Rotate the key that signs device tokens. Both are published; the old one verifies until the last token it signed has
 * ended or was renewed, so no device notices (NIST SP 800-57, 5.3.6: the verifying period outlives the signing one).
 *
 * @throws Refusal `stale` when another key signs by now
 */
export async function rotateSigningKey(
  services: Needs,
  by: Authorized<'credential.write'>,
  wanted: KeyChange,
  remember?: (tx: Tx, answer: Changed) => Promise<void>,
): Promise<Changed> {
  const now = services.clock.now();
  const fresh = await makeSigningKey(services, 'device-token');
  return await services.write(async (tx) => {
    const actor = personActor(by, 'credential.write');
    await replace(tx, fresh, wanted.kid, now, actor, wanted.reason);
    const answer = { kid: fresh.kid, before: wanted.kid };
    await remember?.(tx, answer);
    return answer;
  });
}

/**
 * A key is known to somebody: it is trusted no more from this commit on, whoever shows a token of it. Devices with keys
 * of their own renew by these without being visited; bearer tokens of it are worth nothing and enrol again.
 *
 * @returns how many bound credentials will renew, and how many bearer ones must enrol
 * @throws Refusal `not-found`, `not-possible` when it is distrusted already
 */
export async function distrustSigningKey(
  services: Needs,
  by: Authorized<'credential.write'>,
  { kid, reason }: KeyChange,
  remember?: (tx: Tx, answer: Changed & { renewing: number; enrolling: number }) => Promise<void>,
): Promise<Changed & { renewing: number; enrolling: number }> {
  const now = services.clock.now();
  const fresh = await makeSigningKey(services, 'device-token');
  return await services.write(async (tx) => {
    const actor = personActor(by, 'credential.write');
    const [found] = await tx
      .select()
      .from(signingKey)
      .where(and(eq(signingKey.kid, kid), eq(signingKey.use, 'device-token')))
      .limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.compromisedAt !== null) throw new Refusal('not-possible', 'It is distrusted already.');
    const current = found.supersededAt === null && found.retiredAt === null;
    if (current) await replace(tx, fresh, kid, now, actor, reason);
    await tx
      .update(signingKey)
      .set({ compromisedAt: now, retiredAt: found.retiredAt ?? now, supersededAt: found.supersededAt ?? now })
      .where(eq(signingKey.kid, kid));
    const [counted] = await tx
      .select({
        renewing: sql<number>`coalesce(sum(${credential.boundThumbprint} is not null), 0)`,
        enrolling: sql<number>`coalesce(sum(${credential.boundThumbprint} is null), 0)`,
      })
      .from(credential)
      .where(
        and(
          eq(credential.kid, kid),
          inArray(credential.state, [...LIVING]),
          gt(credential.expiresAt, now),
          isNull(credential.successorId),
        ),
      );
    const { renewing = 0, enrolling = 0 } = counted ?? {};
    await appendEntries(tx, now, [
      {
        kind: 'signing-key-distrusted',
        actor,
        subjects: [{ kind: 'signing-key', id: kid }],
        detail: { reason, renewing, enrolling },
      },
    ]);
    const answer = { kid: current ? fresh.kid : kid, before: kid, renewing, enrolling };
    await remember?.(tx, answer);
    return answer;
  });
}

/** Superseded keys that no living credential was signed by verify no more. Safe to run by several processes. */
export async function retireSigningKeys(services: Needs): Promise<number> {
  const now = services.clock.now();
  const idle = and(
    eq(signingKey.use, 'device-token'),
    isNotNull(signingKey.supersededAt),
    isNull(signingKey.retiredAt),
    notExists(
      services.read
        .select({ one: sql`1` })
        .from(credential)
        .where(
          and(
            eq(credential.kid, signingKey.kid),
            inArray(credential.state, [...LIVING]),
            gt(credential.expiresAt, now),
          ),
        ),
    ),
  );
  const [any] = await services.read.select({ kid: signingKey.kid }).from(signingKey).where(idle).limit(1);
  if (!any) return 0;
  return await services.write(async (tx) => {
    const retired = await tx
      .update(signingKey)
      .set({ retiredAt: now })
      .where(idle)
      .returning({ kid: signingKey.kid });
    await appendEntries(
      tx,
      now,
      retired.map(({ kid }) => ({
        kind: 'signing-key-retired' as const,
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'signing-key' as const, id: kid }],
        detail: { why: 'no living credential was signed by it' },
      })),
    );
    return retired.length;
  });
}
