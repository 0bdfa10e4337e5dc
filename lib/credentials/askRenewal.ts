import { and, eq } from 'drizzle-orm';
import { credential, device } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

/** What stands in the way of acting on a credential that the page still shows as living. */
export async function loadLiving(tx: Tx, id: string, version: number, now: number) {
  const [row] = await tx
    .select({ credential, assetTag: device.assetTag })
    .from(credential)
    .innerJoin(device, eq(device.id, credential.deviceId))
    .where(eq(credential.id, id))
    .limit(1);
  if (!row) throw new Refusal('not-found');
  const { credential: found, assetTag } = row;
  if (found.state === 'revoked' || found.state === 'retired' || found.expiresAt <= now) {
    throw new Refusal(
      'not-possible',
      `${found.label} of ${assetTag} has ended already (${found.endReason ?? 'its time is over'}).`,
    );
  }
  if (found.version !== version)
    throw new Refusal(
      'stale',
      `${found.label} of ${assetTag} was changed in the meantime. It is ${found.state} now.`,
      { version: found.version },
    );
  return { found, assetTag };
}

interface Asked {
  label: string;
  assetTag: string;
  askedAt: number;
}

/**
 * Rotate one credential: the device is told with its next answer to renew. The old one keeps working until the new
 * one is first used, at most 24 hours after it was renewed, so nothing stops.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible`
 */
export async function askRenewal(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'credential.write'>,
  wanted: { id: string; version: number },
  remember?: (tx: Tx, answer: Asked) => Promise<void>,
): Promise<Asked> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const { found, assetTag } = await loadLiving(tx, wanted.id, wanted.version, now);
    if (found.successorId !== null)
      throw new Refusal(
        'not-possible',
        `${found.label} of ${assetTag} was renewed already; its successor is not used yet.`,
      );
    await tx
      .update(credential)
      .set({ renewalAskedAt: now, version: found.version + 1 })
      .where(and(eq(credential.id, found.id), eq(credential.version, found.version)));
    await appendEntries(tx, now, [
      {
        kind: 'credential-renewal-asked',
        actor: personActor(by, 'credential.write'),
        subjects: [
          { kind: 'credential', id: found.id },
          { kind: 'device', id: found.deviceId },
        ],
        detail: { label: found.label },
      },
    ]);
    const answer = { label: found.label, assetTag, askedAt: now };
    await remember?.(tx, answer);
    return answer;
  });
}
