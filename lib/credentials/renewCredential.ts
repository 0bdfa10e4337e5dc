import { eq } from 'drizzle-orm';
import { credential } from '@/db/schema';
import type { CredentialAnswer } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import { credentialAnswer } from '@/lib/keys/credentialAnswer';
import { type AuthenticatedDevice, deviceActor } from '@/lib/keys/device';
import { insertCredential } from '@/lib/keys/issueCredential';
import { currentSigningKey } from '@/lib/keys/signingKeys';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { currentPolicy } from '@/lib/policy/currentPolicy';

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>;

/**
 * Renew a device's credential. A repeated call, because an answer was lost, gets the same successor: each
 * credential has at most one, and the token is made from its row.
 */
export async function renewCredential(
  services: Needs,
  caller: AuthenticatedDevice,
): Promise<{ answer: CredentialAnswer; repeated: boolean }> {
  const key = await currentSigningKey(services, 'device-token');
  const { row, repeated } = await services.write(async (tx) => {
    const now = services.clock.now();
    const [old] = await tx.select().from(credential).where(eq(credential.id, caller.credential.id)).limit(1);
    if (!old || old.state === 'revoked' || old.state === 'retired') throw new Refusal('token-invalid');
    if (old.successorId !== null) {
      const [successor] = await tx
        .select()
        .from(credential)
        .where(eq(credential.id, old.successorId))
        .limit(1);
      if (!successor || successor.state === 'revoked') throw new Refusal('token-invalid');
      return { row: successor, repeated: true };
    }
    const fresh = await insertCredential(tx, {
      deviceId: caller.device.id,
      kid: key.kid,
      boundThumbprint: old.boundThumbprint,
      nowMs: now,
      predecessor: old,
    });
    // The old one lives until the new one is first used, at the longest this.
    const { settings } = await currentPolicy(tx, 'credentials');
    const overlapEndsAt = Math.min(old.expiresAt, now + settings.overlapHours * 3_600_000);
    await tx
      .update(credential)
      .set({
        state: 'superseded',
        successorId: fresh.id,
        overlapEndsAt,
        renewalAskedAt: null,
        version: old.version + 1,
      })
      .where(eq(credential.id, old.id));
    await appendEntries(tx, now, [
      {
        kind: 'credential-renewed',
        actor: deviceActor(caller.device),
        subjects: [
          { kind: 'device', id: caller.device.id },
          { kind: 'credential', id: old.id },
          { kind: 'credential', id: fresh.id },
        ],
        detail: {
          from: old.label,
          to: fresh.label,
          kid: fresh.kid,
          overlapEndsAt: new Date(overlapEndsAt).toISOString(),
          expiresAt: new Date(fresh.expiresAt).toISOString(),
        },
      },
    ]);
    return { row: fresh, repeated: false };
  });
  // Durable from here. If the answer is lost the device repeats the call with the old credential, which still works.
  const signer =
    row.kid === key.kid
      ? key
      : await services.read.query.signingKey.findFirst({ where: (t) => eq(t.kid, row.kid) });
  if (!signer) throw new Error('a credential names a signing key that is not there');
  return { answer: await credentialAnswer(services, row, signer, caller.device), repeated };
}
