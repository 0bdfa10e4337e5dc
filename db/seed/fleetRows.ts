import { eq } from 'drizzle-orm';
import { CompactSign, exportJWK, generateKeyPair } from 'jose';
import { credential, device, deviceModel } from '@/db/schema';
import { ENROLMENT_PROOF_TYPE, type PublicJwk } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import type { Actor } from '@/lib/custody/entry';
import { enrolDevice } from '@/lib/enrolment/enrolDevice';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { addDevice } from '@/lib/fleet/addDevice';
import type { AuthenticatedDevice } from '@/lib/keys/device';
import type { Services } from '@/lib/platform/services';
import type { SeedDevice } from './harrowmere';

const DAY_MS = 86_400_000;

/** The clock of the seed: history is lived through in order, so that the log's times rise. */
export interface SeedClock {
  now(): number;
  set(at: number): void;
}

export interface SeededDevice extends SeedDevice {
  id: string;
  /** null while it waits for its enrolment. */
  authenticated: AuthenticatedDevice | null;
}

export async function addSeedDevice(
  services: Services,
  by: Actor,
  facts: SeedDevice,
  ids: { modelId: string; wardId: string },
): Promise<SeededDevice> {
  const id = await addDevice(services, by, {
    assetTag: facts.assetTag,
    serialNumber: facts.serialNumber,
    modelId: ids.modelId,
    wardId: ids.wardId,
    udi: `(01)05099999${String(Math.abs(hash(facts.model)) % 1_000_000).padStart(6, '0')}(21)${facts.serialNumber}`,
    lot: null,
    firmware: facts.firmware,
  });
  return { ...facts, id, authenticated: null };
}

const hash = (text: string): number =>
  [...text].reduce((sum, char) => (sum * 31 + char.charCodeAt(0)) | 0, 7);

/** Enrol a device as it would itself: a key of its own, a proof, the code of its sheet. */
export async function enrolSeedDevice(services: Services, by: Actor, made: SeededDevice): Promise<void> {
  const { code } = await issueEnrolmentCode(services, by, made.id);
  const pair = await generateKeyPair('EdDSA', { crv: 'Ed25519', extractable: true });
  const { kty, crv, x } = await exportJWK(pair.publicKey);
  const proof = await new CompactSign(
    new TextEncoder().encode(
      JSON.stringify({ aud: services.env.BELLKEEP_ORIGIN, sub: made.serialNumber, code }),
    ),
  )
    .setProtectedHeader({ alg: 'EdDSA', typ: ENROLMENT_PROOF_TYPE })
    .sign(pair.privateKey);
  await enrolDevice(services, {
    code,
    serialNumber: made.serialNumber,
    publicKey: { kty, crv, x } as PublicJwk,
    proof,
    firmware: made.firmware,
  });
  const now = services.clock.now();
  const [row] = await services.read
    .select({ device, model: deviceModel, credential })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .innerJoin(credential, eq(credential.deviceId, device.id))
    .where(eq(device.id, made.id))
    .limit(1);
  if (!row) throw new Error(`${made.assetTag} did not enrol`);
  await services.write(async (tx) => {
    await tx
      .update(credential)
      .set({ state: 'in-use', firstUsedAt: now, lastUsedAt: now })
      .where(eq(credential.id, row.credential.id));
    await tx
      .update(device)
      .set({
        lastCheckAt: now,
        checkDueAt: Math.round(
          now +
            row.model.checkIntervalDays *
              DAY_MS *
              (0.3 + (0.7 * (Math.abs(hash(made.serialNumber)) % 100)) / 100),
        ),
      })
      .where(eq(device.id, made.id));
    await appendEntries(tx, now, [
      {
        kind: 'credential-first-used',
        actor: { kind: 'device', id: made.id, label: made.assetTag },
        subjects: [
          { kind: 'device', id: made.id },
          { kind: 'credential', id: row.credential.id },
        ],
        detail: { label: row.credential.label },
      },
    ]);
  });
  made.authenticated = row as unknown as AuthenticatedDevice;
}
