import { CompleteAnswer, SlotAnswer, type SlotRequest } from '@/lib/contract/device';
import { ServiceProblem, understood } from './answers';
import type { Clip } from './clip';
import { deviceTime } from './clock';
import type { Device } from './device';
import { sha256Hex } from './entry';
import { putBytes } from './put';
import { backoffMs, withRetry } from './retry';

export type { Clip } from './clip';

export interface Sent {
  answer: CompleteAnswer;
  /** How long each step took, with its repetitions and waits. */
  milliseconds: { slot: number; put: number; complete: number };
}

export interface SendOptions {
  /** The recording's number at the service, when its bytes were put before: completing is tried first. */
  putAs?: string;
  /** Told after each step, and waited for: where a queue writes its journal. */
  onStep?(step: 'slotted' | 'put', recording: string): Promise<void>;
}

/** How often a slot that has ended, or lost its bytes, is asked for anew. */
const SLOT_TRIES = 4;
/** A fresh slot may heal these; a number that is not found may be one of a service that was restored. */
const NEEDS_SLOT = new Set(['bytes-missing', 'slot-ended', 'not-found']);

/**
 * Send one clip: slot, presigned PUT, complete. Every step may be repeated, so whatever broke, the whole is tried
 * again from the slot; the service carries on from where it is.
 *
 * @throws ServiceProblem when the service refuses it for good; NoAnswer when it could not be reached
 */
export async function sendRecording(device: Device, clip: Clip, options: SendOptions = {}): Promise<Sent> {
  const request = slotRequest(device, clip);
  const milliseconds = { slot: 0, put: 0, complete: 0 };
  const timed = async <T>(step: keyof typeof milliseconds, work: () => Promise<T>): Promise<T> => {
    const from = performance.now();
    try {
      return await withRetry(device, work);
    } finally {
      milliseconds[step] += performance.now() - from;
    }
  };
  let recording = options.putAs ?? null;
  for (let attempt = 0; ; attempt++) {
    try {
      recording ??= await bringBytes(device, clip, request, timed, options);
      const number = recording;
      const answer = await timed('complete', async () =>
        understood(
          CompleteAnswer,
          await device.call(`/api/device/v1/recordings/${encodeURIComponent(number)}/complete`, {}),
        ),
      );
      return { answer, milliseconds };
    } catch (error) {
      const again = error instanceof ServiceProblem && NEEDS_SLOT.has(error.code);
      if (!again || attempt + 1 >= SLOT_TRIES) throw error;
      // Where the number of an earlier life was tried, nothing is wrong yet; otherwise not in a storm.
      if (recording !== options.putAs) await device.sleep(backoffMs(attempt, device.random));
      recording = null;
    }
  }
}

type Timed = <T>(step: 'slot' | 'put', work: () => Promise<T>) => Promise<T>;

/** Slot and PUT. @returns the service's number for the recording, whose bytes are there */
async function bringBytes(
  device: Device,
  clip: Clip,
  request: SlotRequest,
  timed: Timed,
  options: SendOptions,
): Promise<string> {
  const slot = await timed('slot', async () =>
    understood(
      SlotAnswer,
      await device.call('/api/device/v1/recordings', {
        ...request,
        deviceTime: deviceTime(device.clock.now()),
      }),
    ),
  );
  await options.onStep?.('slotted', slot.recording);
  const { upload } = slot;
  if (upload) await timed('put', () => putBytes(device, upload, clip.bytes));
  await options.onStep?.('put', slot.recording);
  return slot.recording;
}

function slotRequest(device: Device, clip: Clip): SlotRequest {
  const { bytes, ...facts } = clip;
  return {
    ...facts,
    recordedAt: deviceTime(facts.recordedAt),
    sha256: sha256Hex(bytes),
    bytes: bytes.length,
    deviceTime: deviceTime(device.clock.now()),
  };
}
