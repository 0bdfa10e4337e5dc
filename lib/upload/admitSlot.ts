import type { SlotRequest } from '@/lib/contract/device';
import { appendEntries } from '@/lib/custody/append';
import { type AuthenticatedDevice, deviceActor } from '@/lib/keys/device';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

/** Bytes a second that no model exceeds a clip with: 8 channels of 64 bits at its highest rate, and headers. */
const BYTES_PER_FRAME = 64;
const HEADER_ALLOWANCE_BYTES = 1 << 20;

/** Service states in which a device may send. In the others its clips stay valid on the device. */
const SENDING = new Set(['in-service']);

/**
 * Whether this device may send this recording. A refusal is written to custody, because a pattern of refusals is
 * something an auditor asks about.
 *
 * @throws Refusal `device-not-in-service`, `media-type-refused`, `recording-too-large`
 */
export async function admitSlot(
  services: Pick<Services, 'write' | 'clock'>,
  caller: AuthenticatedDevice,
  request: SlotRequest,
): Promise<void> {
  const { device, model } = caller;
  const highestRate = Math.max(8000, ...model.sampleRatesHz);
  const largest = model.longestClipSeconds * highestRate * BYTES_PER_FRAME + HEADER_ALLOWANCE_BYTES;
  let refusal: Refusal | null = null;
  if (!SENDING.has(device.state)) {
    refusal = new Refusal(
      'device-not-in-service',
      `${device.assetTag} is ${device.state.replace('-', ' ')}. Its clips stay valid; take it to biomedical engineering.`,
    );
  } else if (!model.mediaTypes.includes(request.mediaType)) {
    refusal = new Refusal(
      'media-type-refused',
      `${model.name} sends ${model.mediaTypes.join(', ')}, not ${request.mediaType}. Nothing was stored.`,
      { allowed: model.mediaTypes },
    );
  } else if (request.bytes > largest) {
    refusal = new Refusal(
      'recording-too-large',
      `${request.bytes} bytes are more than a clip of ${model.longestClipSeconds} s can have. Nothing was stored.`,
      { largestBytes: largest },
    );
  }
  if (!refusal) return;
  const why = refusal.code;
  await services.write((tx) =>
    appendEntries(tx, services.clock.now(), [
      {
        kind: 'slot-refused',
        actor: deviceActor(device),
        subjects: [{ kind: 'device', id: device.id }],
        detail: {
          why,
          deviceRecordingNumber: request.recordingNumber,
          mediaType: request.mediaType,
          bytes: request.bytes,
        },
      },
    ]),
  );
  throw refusal;
}
