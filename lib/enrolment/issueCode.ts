import { createHmac } from 'node:crypto';
import { and, eq, isNull } from 'drizzle-orm';
import { device, enrolmentCode } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import type { Actor } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { newId, readableCode } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

export const CODE_LENGTH = 10;
export const CODE_LIFETIME_MS = 24 * 3_600_000;
export const CODE_TRIES = 5;

/** The hash a code is kept by: HMAC-SHA-256 under the service's secret, so that a copied database opens nothing. */
export const codeHash = (services: Pick<Services, 'env'>, code: string): string =>
  createHmac('sha256', Buffer.from(services.env.BELLKEEP_SECRET_KEY, 'base64'))
    .update(`enrolment ${code}`)
    .digest('hex');

/**
 * Make a one-time enrolment code for a device. An earlier open code of the same device is withdrawn.
 *
 * @returns the code, shown once and stored nowhere, and when it ends (UTC ms)
 * @throws Refusal `not-found`; `not-possible` for a retired or lost device
 */
export async function issueEnrolmentCode(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  by: Actor,
  deviceId: string,
): Promise<{ code: string; expiresAt: number; assetTag: string; serialNumber: string }> {
  const code = readableCode(CODE_LENGTH);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [found] = await tx.select().from(device).where(eq(device.id, deviceId)).limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.state === 'retired' || found.state === 'lost') {
      throw new Refusal('not-possible', `${found.assetTag} is ${found.state}. Put it back in service first.`);
    }
    await tx
      .update(enrolmentCode)
      .set({ withdrawnAt: now })
      .where(
        and(
          eq(enrolmentCode.deviceId, deviceId),
          isNull(enrolmentCode.usedAt),
          isNull(enrolmentCode.withdrawnAt),
        ),
      );
    await tx.insert(enrolmentCode).values({
      id: newId(),
      deviceId,
      codeHash: codeHash(services, code),
      createdBy: by.id,
      createdAt: now,
      expiresAt: now + CODE_LIFETIME_MS,
      triesLeft: CODE_TRIES,
    });
    await appendEntries(tx, now, [
      {
        kind: 'enrolment-code-issued',
        actor: by,
        subjects: [{ kind: 'device', id: deviceId }],
        detail: { expiresAt: new Date(now + CODE_LIFETIME_MS).toISOString(), tries: CODE_TRIES },
      },
    ]);
    return {
      code,
      expiresAt: now + CODE_LIFETIME_MS,
      assetTag: found.assetTag,
      serialNumber: found.serialNumber,
    };
  });
}
