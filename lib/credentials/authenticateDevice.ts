import { eq, lt } from 'drizzle-orm';
import { credential, device, deviceModel, proofSeen } from '@/db/schema';
import { isUniqueViolation, type Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import {
  type AuthenticatedDevice,
  type DeviceModelRow,
  type DeviceRow,
  deviceActor,
} from '@/lib/keys/device';
import { type CredentialRow, verifyToken } from '@/lib/keys/token';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { proofMemoryMs } from './nonce';
import { noteMisuse } from './quarantineFamily';
import { verifyProof } from './verifyProof';

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** How often "last heard" is written for a device that keeps calling. */
const HEARD_EVERY_MS = 15_000;

const refused = (why: string) => new Refusal('token-invalid', undefined, {}, { cause: why });

/**
 * Who is calling: token, then its row (revoked, retired, superseded), then the proof of the key it is bound to.
 * First use of a successor retires its predecessor.
 *
 * A token whose signing key is trusted no more says nothing of who shows it: then the proof alone does, by the key that
 * the device enrolled with, and it is good for renewing only.
 *
 * @param address the called address as devices see it, without query
 * @param options.renewing the call is the one that renews
 * @throws Refusal `token-invalid`, `proof-invalid`, `use-dpop-nonce`, `renewal-needed`
 */
export async function authenticateDevice(
  services: Needs,
  request: Request,
  address: string,
  options: { renewing?: boolean } = {},
): Promise<AuthenticatedDevice> {
  const { scheme, token } = readAuthorization(request);
  const claims = await verifyToken(services, token);
  const [row] = await services.read
    .select({ credential, device, model: deviceModel })
    .from(credential)
    .innerJoin(device, eq(device.id, credential.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .where(eq(credential.id, claims.credentialId))
    .limit(1);
  if (
    !row ||
    row.credential.deviceId !== claims.deviceId ||
    row.credential.boundThumbprint !== claims.thumbprint
  ) {
    throw refused('no such credential');
  }
  if (claims.distrusted && row.credential.boundThumbprint === null) throw refused('signing key distrusted');
  const now = services.clock.now();
  const standing = standingOf(row.credential, now);
  let jti: string | null = null;
  if (row.credential.boundThumbprint !== null) {
    if (scheme !== 'dpop') throw refused('bound credential sent as bearer');
    const proof = request.headers.get('dpop');
    if (proof === null) throw new Refusal('proof-invalid', 'The request carries no DPoP proof.');
    jti = await verifyProof(services, {
      proof,
      method: request.method,
      url: address,
      token,
      thumbprint: row.credential.boundThumbprint,
    });
  } else if (scheme !== 'bearer' || row.model.signsRequests) {
    throw refused('plain bearer is not allowed for this model');
  }
  if (standing !== 'good') {
    // The proof was right, so it is the device itself or its stolen key: the alarm is worth a line of custody.
    await noteMisuse(services, row, standing);
    throw refused(standing);
  }
  if (claims.distrusted && !options.renewing) throw new Refusal('renewal-needed');
  const quietly = row.credential.firstUsedAt !== null && now - (row.device.lastHeardAt ?? 0) < HEARD_EVERY_MS;
  if (jti !== null || !quietly) await services.write((tx) => noteUse(tx, row, jti, now));
  return { device: row.device, model: row.model, credential: row.credential } as AuthenticatedDevice;
}

function readAuthorization(request: Request): { scheme: 'dpop' | 'bearer'; token: string } {
  const match = /^(DPoP|Bearer) +([\w.~+/=-]+)$/i.exec(request.headers.get('authorization') ?? '');
  if (!match) throw refused('no authorization');
  return { scheme: match[1]?.toLowerCase() as 'dpop' | 'bearer', token: match[2] ?? '' };
}

function standingOf(row: CredentialRow, now: number): string {
  if (row.state === 'revoked' || row.state === 'retired') return row.state;
  if (row.expiresAt <= now) return 'expired';
  if (row.state === 'superseded' && (row.overlapEndsAt ?? 0) <= now) return 'overlap ended';
  return 'good';
}

async function noteUse(
  tx: Tx,
  row: { credential: CredentialRow; device: DeviceRow; model: DeviceModelRow },
  jti: string | null,
  now: number,
) {
  if (jti !== null) {
    await tx.delete(proofSeen).where(lt(proofSeen.expiresAt, now));
    try {
      await tx
        .insert(proofSeen)
        .values({ key: `${row.credential.id} ${jti}`, expiresAt: now + proofMemoryMs });
    } catch (error) {
      if (isUniqueViolation(error)) throw new Refusal('proof-invalid', 'This proof was used before.');
      throw error;
    }
  }
  await tx.update(device).set({ lastHeardAt: now }).where(eq(device.id, row.device.id));
  const [fresh] = await tx.select().from(credential).where(eq(credential.id, row.credential.id)).limit(1);
  if (!fresh) return;
  await tx
    .update(credential)
    .set({
      lastUsedAt: now,
      firstUsedAt: fresh.firstUsedAt ?? now,
      state: fresh.state === 'issued' ? 'in-use' : fresh.state,
    })
    .where(eq(credential.id, fresh.id));
  if (fresh.firstUsedAt !== null) return;
  const subjects = [
    { kind: 'device' as const, id: row.device.id },
    { kind: 'credential' as const, id: fresh.id },
  ];
  await appendEntries(tx, now, [
    {
      kind: 'credential-first-used',
      actor: deviceActor(row.device),
      subjects,
      detail: { label: fresh.label },
    },
  ]);
  if (fresh.predecessorId === null) return;
  const [retired] = await tx
    .update(credential)
    .set({ state: 'retired', endReason: 'its successor is in use' })
    .where(eq(credential.id, fresh.predecessorId))
    .returning({ id: credential.id, label: credential.label, state: credential.state });
  if (retired) {
    await appendEntries(tx, now, [
      {
        kind: 'credential-retired',
        actor: SERVICE_ACTOR,
        subjects: [
          { kind: 'device', id: row.device.id },
          { kind: 'credential', id: retired.id },
        ],
        detail: { label: retired.label, why: 'its successor is in use' },
      },
    ]);
  }
}
