import { createHash } from 'node:crypto';
import { and, eq } from 'drizzle-orm';
import { recording } from '@/db/schema';
import { isUniqueViolation } from '@/db/write';
import type { SlotAnswer, SlotRequest } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import { type AuthenticatedDevice, deviceActor } from '@/lib/keys/device';
import { shouldRenew } from '@/lib/keys/issueCredential';
import { Refusal } from '@/lib/platform/errors';
import { newId, newRecordingNumber } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { admitSlot } from './admitSlot';

/** How long a presigned address admits the bytes. */
export const SLOT_LIFETIME_SECONDS = 300;

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'storage' | 'env'>;
type RecordingRow = typeof recording.$inferSelect;

/**
 * What makes two requests for one recording number the same recording. What the device's clock says now is left out:
 * it differs in every honest repeat.
 */
function requestHash(request: SlotRequest): string {
  const { deviceTime: _now, ...lasting } = request;
  const ordered = Object.fromEntries(Object.entries(lasting).sort(([a], [b]) => (a < b ? -1 : 1)));
  return createHash('sha256').update(JSON.stringify(ordered)).digest('hex');
}

/**
 * Admit one recording: a presigned PUT that takes exactly these bytes, for five minutes.
 *
 * The device's recording number is the idempotency key: the same request again gets the same recording with a fresh
 * address, or none when the bytes are already safe. The same number with other content is refused; the first stays.
 *
 * @throws Refusal `device-not-in-service`, `media-type-refused`, `recording-too-large`, `recording-conflict`
 */
export async function issueSlot(
  services: Needs,
  caller: AuthenticatedDevice,
  request: SlotRequest,
): Promise<SlotAnswer> {
  const hash = requestHash(request);
  const known = await findByDeviceNumber(services, caller.device.id, request.recordingNumber);
  if (known) return await repeatSlot(services, caller, known, request, hash);
  await admitSlot(services, caller, request);

  const now = services.clock.now();
  const id = newId();
  const clockOffsetMs = request.deviceTime - now;
  const row = {
    id,
    number: newRecordingNumber(),
    deviceId: caller.device.id,
    modelId: caller.model.id,
    credentialId: caller.credential.id,
    deviceRecordingNumber: request.recordingNumber,
    stage: 'awaited' as const,
    declaredSha256: request.sha256,
    declaredBytes: request.bytes,
    mediaType: request.mediaType,
    recordedAtDevice: request.recordedAt,
    // The device's clock may be years off; what it says now tells by how much.
    recordedAt: Math.min(now, request.recordedAt - clockOffsetMs),
    clockOffsetMs,
    site: request.site ?? null,
    chestpieceSide: request.chestpieceSide ?? null,
    gainStep: request.gainStep ?? null,
    filter: request.filter ?? null,
    firmware: caller.device.firmware,
    scannedIdentifier: request.scannedIdentifier ?? null,
    requestHash: hash,
    slotKey: `incoming/${id}/${request.sha256}`,
    slotExpiresAt: now + SLOT_LIFETIME_SECONDS * 1000,
    awaitedAt: now,
  };
  try {
    await services.write(async (tx) => {
      await tx.insert(recording).values(row);
      await appendEntries(tx, now, [
        {
          kind: 'slot-issued',
          actor: deviceActor(caller.device),
          subjects: [
            { kind: 'recording', id },
            { kind: 'device', id: caller.device.id },
          ],
          detail: {
            number: row.number,
            deviceRecordingNumber: row.deviceRecordingNumber,
            sha256: row.declaredSha256,
            bytes: row.declaredBytes,
            mediaType: row.mediaType,
            seconds: SLOT_LIFETIME_SECONDS,
            credential: caller.credential.label,
            clockOffsetMs,
            ...(row.site ? { site: row.site } : {}),
          },
        },
      ]);
    });
  } catch (error) {
    if (!isUniqueViolation(error)) throw error;
    // The same device asked twice at once: the other call made the row.
    const first = await findByDeviceNumber(services, caller.device.id, request.recordingNumber);
    if (!first) throw error;
    return await repeatSlot(services, caller, first, request, hash);
  }
  // Durable from here. A device that dies before it reads the answer asks again with the same number.
  return await answerFor(services, caller, row, false);
}

async function findByDeviceNumber(
  services: Needs,
  deviceId: string,
  number: string,
): Promise<RecordingRow | null> {
  const [row] = await services.read
    .select()
    .from(recording)
    .where(and(eq(recording.deviceId, deviceId), eq(recording.deviceRecordingNumber, number)))
    .limit(1);
  return row ?? null;
}

async function repeatSlot(
  services: Needs,
  caller: AuthenticatedDevice,
  row: RecordingRow,
  request: SlotRequest,
  hash: string,
): Promise<SlotAnswer> {
  const now = services.clock.now();
  if (row.requestHash !== hash) {
    await services.write((tx) =>
      appendEntries(tx, now, [
        {
          kind: 'slot-refused',
          actor: deviceActor(caller.device),
          subjects: [
            { kind: 'recording', id: row.id },
            { kind: 'device', id: caller.device.id },
          ],
          detail: {
            why: 'recording-conflict',
            deviceRecordingNumber: request.recordingNumber,
            sha256: request.sha256,
          },
        },
      ]),
    );
    throw new Refusal('recording-conflict', undefined, { recording: row.number });
  }
  if (row.stopped !== null) throw new Refusal('bytes-mismatch', undefined, { recording: row.number });
  if (row.stage === 'awaited') {
    await services.write(async (tx) => {
      await tx
        .update(recording)
        .set({ slotExpiresAt: now + SLOT_LIFETIME_SECONDS * 1000 })
        .where(and(eq(recording.id, row.id), eq(recording.stage, 'awaited')));
    });
  }
  return await answerFor(services, caller, row, true);
}

type SlotFacts = Pick<
  RecordingRow,
  'number' | 'stage' | 'slotKey' | 'declaredBytes' | 'declaredSha256' | 'mediaType'
>;

async function answerFor(
  services: Needs,
  caller: AuthenticatedDevice,
  row: SlotFacts,
  repeated: boolean,
): Promise<SlotAnswer> {
  const now = services.clock.now();
  const upload =
    row.stage === 'awaited'
      ? await services.storage.presignPut({
          key: row.slotKey,
          contentLength: row.declaredBytes,
          contentType: row.mediaType,
          sha256: Buffer.from(row.declaredSha256, 'hex'),
          expiresSeconds: SLOT_LIFETIME_SECONDS,
        })
      : null;
  return {
    recording: row.number,
    repeated,
    upload: upload && {
      method: 'PUT',
      url: upload.url,
      headers: upload.headers,
      expiresAt: now + SLOT_LIFETIME_SECONDS * 1000,
    },
    complete: `${services.env.BELLKEEP_ORIGIN}/api/device/v1/recordings/${row.number}/complete`,
    renew: shouldRenew(caller.credential, now),
  };
}
