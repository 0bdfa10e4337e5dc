import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { apiClient } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { loadClient } from './rotateSecret';

export const Revocation = z.strictObject({
  version: z.number().int(),
  reason: z.string().trim().min(5).max(500),
});

/**
 * Another system reads no more: from this commit on neither its secret, nor its keys, nor its tokens are accepted.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible`
 */
export async function revokeClient(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'connections.write'>,
  id: string,
  wanted: z.infer<typeof Revocation>,
  remember?: (tx: Tx, answer: { revokedAt: number }) => Promise<void>,
): Promise<{ revokedAt: number }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const row = await loadClient(tx, id, wanted.version);
    await tx
      .update(apiClient)
      .set({ revokedAt: now, secretHash: null, previousSecretHash: null, version: row.version + 1 })
      .where(eq(apiClient.id, id));
    await appendEntries(tx, now, [
      {
        kind: 'client-revoked',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'client', id }],
        detail: { name: row.name, reason: wanted.reason },
      },
    ]);
    const answer = { revokedAt: now };
    await remember?.(tx, answer);
    return answer;
  });
}
