import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { apiClient } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import type { CreatedClient } from './createClient';
import { secretHash } from './secretHash';

/** How long the secret before works on, so that nothing stops. */
const OVERLAP_MS = 24 * 3_600_000;

export const Rotation = z.strictObject({
  version: z.number().int(),
  /** The old one stops now: it is known to somebody. */
  atOnce: z.boolean(),
});

/** A client that the page still shows as living. @throws Refusal `not-found`, `not-possible`, `stale` */
export async function loadClient(tx: Tx, id: string, version: number) {
  const [row] = await tx.select().from(apiClient).where(eq(apiClient.id, id)).limit(1);
  if (!row) throw new Refusal('not-found');
  if (row.revokedAt !== null) throw new Refusal('not-possible', `${row.name} was revoked already.`);
  if (row.version !== version)
    throw new Refusal('stale', `${row.name} was changed in the meantime.`, { version: row.version });
  return row;
}

/**
 * A new secret for a client. The one before works for another day, unless it must stop at once.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible` also for a client that has keys and no secret
 */
export async function rotateSecret(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'connections.write'>,
  id: string,
  wanted: z.infer<typeof Rotation>,
  remember?: (tx: Tx, answer: CreatedClient) => Promise<void>,
): Promise<CreatedClient> {
  const now = services.clock.now();
  const secret = newSecret();
  return await services.write(async (tx) => {
    const row = await loadClient(tx, id, wanted.version);
    if (row.method !== 'client_secret_basic')
      throw new Refusal('not-possible', `${row.name} signs in with keys of its own and has no secret.`);
    await tx
      .update(apiClient)
      .set({
        secretHash: secretHash(secret),
        previousSecretHash: wanted.atOnce ? null : row.secretHash,
        previousEndsAt: wanted.atOnce ? null : now + OVERLAP_MS,
        version: row.version + 1,
      })
      .where(eq(apiClient.id, id));
    await appendEntries(tx, now, [
      {
        kind: 'client-rotated',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'client', id }],
        detail: { name: row.name, atOnce: wanted.atOnce },
      },
    ]);
    await remember?.(tx, { clientId: id, secret: null });
    return { clientId: id, secret };
  });
}
