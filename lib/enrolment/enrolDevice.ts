import { timingSafeEqual } from 'node:crypto';
import { and, desc, eq, inArray, isNull } from 'drizzle-orm';
import { credential, device, deviceModel, enrolmentCode } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { CredentialAnswer, EnrolRequest } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { credentialAnswer } from '@/lib/keys/credentialAnswer';
import { type DeviceRow, deviceActor } from '@/lib/keys/device';
import { insertCredential } from '@/lib/keys/issueCredential';
import { currentSigningKey, type SigningKeyRow } from '@/lib/keys/signingKeys';
import type { CredentialRow } from '@/lib/keys/token';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { codeHash } from './issueCode';
import { verifyEnrolmentProof } from './verifyProof';

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets' | 'log'>;
type Outcome =
  | { kind: 'enrolled' | 'repeated'; device: DeviceRow; credential: CredentialRow }
  | { kind: 'refused'; why: string };

const sameHash = (a: string, b: string) =>
  a.length === b.length && timingSafeEqual(Buffer.from(a), Buffer.from(b));

/**
 * Take a device's public key in exchange for its one-time code, and give it its first credential.
 *
 * A device that got no answer repeats the call with the same code and key and gets the same credential. A wrong
 * code, an unknown serial number, a dead code and a bad proof are answered alike.
 *
 * @throws Refusal `enrolment-refused`
 */
export async function enrolDevice(
  services: Needs,
  request: EnrolRequest,
): Promise<{ answer: CredentialAnswer; repeated: boolean }> {
  const thumbprint = await verifyEnrolmentProof(request.proof, {
    publicKey: request.publicKey,
    origin: services.env.BELLKEEP_ORIGIN,
    serialNumber: request.serialNumber,
    code: request.code,
  });
  const key = await currentSigningKey(services, 'device-token');
  const outcome = await services.write((tx) => tryCode(tx, services, request, thumbprint, key));
  // Durable from here: the code is used and the credential stands, or the try is counted. A device that dies before
  // it reads the answer repeats the call.
  if (outcome.kind === 'refused') {
    services.log.warn({ why: outcome.why }, 'enrolment refused');
    throw new Refusal('enrolment-refused');
  }
  return {
    answer: await credentialAnswer(
      services,
      outcome.credential,
      await keyOf(services, outcome.credential, key),
      outcome.device,
    ),
    repeated: outcome.kind === 'repeated',
  };
}

async function keyOf(services: Needs, row: CredentialRow, current: SigningKeyRow): Promise<SigningKeyRow> {
  if (row.kid === current.kid) return current;
  const found = await services.read.query.signingKey.findFirst({ where: (t) => eq(t.kid, row.kid) });
  if (!found) throw new Error('a credential names a signing key that is not there');
  return found;
}

async function tryCode(
  tx: Tx,
  services: Needs,
  request: EnrolRequest,
  thumbprint: string | null,
  key: SigningKeyRow,
): Promise<Outcome> {
  const now = services.clock.now();
  const rows = await tx
    .select({ code: enrolmentCode, device, signs: deviceModel.signsRequests })
    .from(enrolmentCode)
    .innerJoin(device, eq(device.id, enrolmentCode.deviceId))
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .where(and(eq(device.serialNumber, request.serialNumber), isNull(enrolmentCode.withdrawnAt)))
    .orderBy(desc(enrolmentCode.createdAt))
    .limit(8);
  const hash = codeHash(services, request.code);
  const hit = rows.find((row) => sameHash(row.code.codeHash, hash));

  if (hit?.code.usedAt != null) {
    // The answer may have been lost: the same code by the same key gets the same credential, while it is still the
    // device's last word.
    if (
      thumbprint === null ||
      hit.device.keyThumbprint !== thumbprint ||
      hit.code.credentialId === null ||
      hit.code.expiresAt <= now
    ) {
      return { kind: 'refused', why: 'code used before' };
    }
    const [given] = await tx
      .select()
      .from(credential)
      .where(eq(credential.id, hit.code.credentialId))
      .limit(1);
    if (!given || given.state === 'revoked' || given.state === 'retired')
      return { kind: 'refused', why: 'credential ended' };
    return { kind: 'repeated', device: hit.device, credential: given };
  }

  if (!hit || thumbprint === null || hit.code.expiresAt <= now || hit.code.triesLeft <= 0) {
    await countTry(
      tx,
      now,
      rows.filter((row) => row.code.usedAt === null),
      hit ? 'proof or code not valid' : 'wrong code',
    );
    return { kind: 'refused', why: hit ? 'proof, time or tries' : 'no such code' };
  }
  if (!['waiting', 'in-service', 'in-repair', 'quarantined'].includes(hit.device.state)) {
    return { kind: 'refused', why: `device is ${hit.device.state}` };
  }
  const enrolled = await enrolNow(tx, now, hit, request, thumbprint, key);
  return { kind: 'enrolled', ...enrolled };
}

async function countTry(
  tx: Tx,
  now: number,
  open: { code: typeof enrolmentCode.$inferSelect; device: DeviceRow }[],
  why: string,
) {
  for (const { code, device: tried } of open) {
    if (code.triesLeft <= 0) continue;
    await tx
      .update(enrolmentCode)
      .set({ triesLeft: code.triesLeft - 1 })
      .where(eq(enrolmentCode.id, code.id));
    await appendEntries(tx, now, [
      {
        kind: 'enrolment-code-refused',
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'device', id: tried.id }],
        detail: { why, triesLeft: code.triesLeft - 1 },
      },
    ]);
  }
}

async function enrolNow(
  tx: Tx,
  now: number,
  hit: { code: typeof enrolmentCode.$inferSelect; device: DeviceRow; signs: boolean },
  request: EnrolRequest,
  thumbprint: string,
  key: SigningKeyRow,
): Promise<{ device: DeviceRow; credential: CredentialRow }> {
  // A device has one family at a time: what an earlier enrolment gave ends here.
  const ended = await tx
    .update(credential)
    .set({ state: 'revoked', revokedAt: now, endReason: 'enrolled again' })
    .where(
      and(
        eq(credential.deviceId, hit.device.id),
        inArray(credential.state, ['issued', 'in-use', 'superseded']),
      ),
    )
    .returning({ id: credential.id });
  const given = await insertCredential(tx, {
    deviceId: hit.device.id,
    kid: key.kid,
    boundThumbprint: hit.signs ? thumbprint : null,
    nowMs: now,
  });
  const change = {
    keyThumbprint: thumbprint,
    publicJwk: request.publicKey as Record<string, unknown>,
    enrolledAt: now,
    lastHeardAt: now,
    state: hit.device.state === 'waiting' ? ('in-service' as const) : hit.device.state,
    ...(request.firmware ? { firmware: request.firmware } : {}),
    version: hit.device.version + 1,
  };
  await tx.update(device).set(change).where(eq(device.id, hit.device.id));
  await tx
    .update(enrolmentCode)
    .set({ usedAt: now, credentialId: given.id })
    .where(eq(enrolmentCode.id, hit.code.id));
  const subjects = [
    { kind: 'device' as const, id: hit.device.id },
    { kind: 'credential' as const, id: given.id },
  ];
  await appendEntries(tx, now, [
    ...ended.map((old) => ({
      kind: 'credential-revoked' as const,
      actor: deviceActor(hit.device),
      subjects: [
        { kind: 'device' as const, id: hit.device.id },
        { kind: 'credential' as const, id: old.id },
      ],
      detail: { why: 'enrolled again' },
    })),
    {
      kind: 'device-enrolled',
      actor: deviceActor(hit.device),
      subjects,
      detail: {
        serialNumber: hit.device.serialNumber,
        thumbprint,
        keyType: request.publicKey.crv,
        ...(request.firmware ? { firmware: request.firmware } : {}),
      },
      before: { state: hit.device.state, thumbprint: hit.device.keyThumbprint },
      after: { state: change.state, thumbprint },
    },
    {
      kind: 'credential-issued',
      actor: SERVICE_ACTOR,
      subjects,
      detail: {
        label: given.label,
        kid: given.kid,
        bound: given.boundThumbprint !== null,
        expiresAt: new Date(given.expiresAt).toISOString(),
      },
    },
  ]);
  return { device: { ...hit.device, ...change }, credential: given };
}
