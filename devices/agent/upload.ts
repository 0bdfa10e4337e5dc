import { createHash } from 'node:crypto';
import type { z } from 'zod';
import { CompleteAnswer, SlotAnswer, type SlotRequest, type UploadTarget } from '@/lib/contract/device';
import { NoAnswer, ServiceProblem } from './api';
import type { Device } from './device';
import { withRetry } from './retry';

export interface Clip {
  /** The device's own number: the same clip always goes under the same one. */
  recordingNumber: string;
  bytes: Uint8Array;
  mediaType: string;
  /** By the device's clock, UTC ms. */
  recordedAt: number;
  site?: SlotRequest['site'];
  chestpieceSide?: SlotRequest['chestpieceSide'];
  gainStep?: number;
  filter?: string;
  scannedIdentifier?: string;
}

export interface Sent {
  answer: CompleteAnswer;
  milliseconds: { slot: number; put: number; complete: number };
}

/** How often a slot that has ended is asked for anew. */
const SLOT_TRIES = 4;

/**
 * Send one clip: slot, presigned PUT, complete. Every step may be repeated, so whatever broke, the whole is tried
 * again from the slot; the service carries on from where it is.
 *
 * @throws ServiceProblem when the service refuses it for good; NoAnswer when it could not be reached
 */
export async function sendRecording(device: Device, clip: Clip): Promise<Sent> {
  const request = slotRequest(device, clip);
  const milliseconds = { slot: 0, put: 0, complete: 0 };
  const timed = async <T>(step: keyof typeof milliseconds, work: () => Promise<T>): Promise<T> => {
    const from = performance.now();
    try {
      return await work();
    } finally {
      milliseconds[step] += performance.now() - from;
    }
  };
  for (let attempt = 1; ; attempt++) {
    const slot = await timed('slot', async () =>
      SlotAnswer.parse(
        await withRetry(device, () =>
          device.call('/api/device/v1/recordings', { ...request, deviceTime: device.clock.now() }),
        ),
      ),
    );
    try {
      const { upload } = slot;
      if (upload) await timed('put', () => withRetry(device, () => put(device, upload, clip.bytes)));
      const answer = await timed('complete', async () =>
        CompleteAnswer.parse(
          await withRetry(device, () =>
            device.call(`/api/device/v1/recordings/${slot.recording}/complete`, {}),
          ),
        ),
      );
      return { answer, milliseconds };
    } catch (error) {
      const again = error instanceof ServiceProblem && ['bytes-missing', 'slot-ended'].includes(error.code);
      if (!again || attempt >= SLOT_TRIES) throw error;
    }
  }
}

function slotRequest(device: Device, clip: Clip): SlotRequest {
  const { bytes, ...facts } = clip;
  return {
    ...facts,
    sha256: createHash('sha256').update(bytes).digest('hex'),
    bytes: bytes.length,
    deviceTime: device.clock.now(),
  };
}

/** Put the bytes to storage, exactly as the slot says. */
async function put(device: Device, target: z.infer<typeof UploadTarget>, bytes: Uint8Array): Promise<void> {
  // fetch computes Content-Length from the body itself and refuses to be told.
  const headers = Object.fromEntries(
    Object.entries(target.headers).filter(
      ([name]) => !['content-length', 'host'].includes(name.toLowerCase()),
    ),
  );
  let response: Response;
  try {
    response = await device.fetch(target.url, {
      method: target.method,
      headers,
      body: bytes as Uint8Array<ArrayBuffer>,
      signal: AbortSignal.timeout(300_000),
    });
    await response.arrayBuffer();
  } catch (cause) {
    throw new NoAnswer('storage gave no answer', { cause });
  }
  // Precondition failed: bytes of an earlier try are there. Whether they are the right ones, completing tells.
  if (response.ok || response.status === 412) return;
  if (response.status >= 500 || response.status === 409)
    throw new NoAnswer(`storage answered ${response.status}`);
  throw new ServiceProblem(
    response.status,
    { type: 'about:blank/slot-ended', title: 'Storage refused the upload', status: response.status },
    null,
  );
}
