import { and, eq, inArray } from 'drizzle-orm';
import { credential } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { loadLiving } from './askRenewal';

interface Revoked {
  labels: string[];
  assetTag: string;
}

/**
 * Revoke a credential and every living one of its family: whoever holds it could otherwise renew into a fresh one.
 * The device must be enrolled again at the bench.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible`
 */
export async function revokeCredential(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'credential.write'>,
  wanted: { id: string; version: number; reason: string },
  remember?: (tx: Tx, answer: Revoked) => Promise<void>,
): Promise<Revoked> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const { found, assetTag } = await loadLiving(tx, wanted.id, wanted.version, now);
    const ended = await tx
      .update(credential)
      .set({ state: 'revoked', revokedAt: now, endReason: wanted.reason })
      .where(
        and(
          eq(credential.familyId, found.familyId),
          inArray(credential.state, ['issued', 'in-use', 'superseded']),
        ),
      )
      .returning({ id: credential.id, label: credential.label });
    await appendEntries(
      tx,
      now,
      ended.map((row) => ({
        kind: 'credential-revoked' as const,
        actor: personActor(by, 'credential.write'),
        subjects: [
          { kind: 'credential' as const, id: row.id },
          { kind: 'device' as const, id: found.deviceId },
        ],
        detail: { label: row.label, why: wanted.reason },
      })),
    );
    const answer = { labels: ended.map((row) => row.label), assetTag };
    await remember?.(tx, answer);
    return answer;
  });
}
