import type { CompleteAnswer } from '@/lib/contract/device';
import { NoAnswer, ServiceProblem } from './answers';
import type { Device } from './device';
import type { Entry, Queue } from './queue';
import { renew } from './renew';
import { isPassing } from './retry';
import { sendRecording } from './upload';

export type QueueEvent =
  | { kind: 'sent'; entry: Entry; answer: CompleteAnswer }
  | { kind: 'refused'; entry: Entry; problem: ServiceProblem }
  | { kind: 'damaged'; entry: Entry }
  | { kind: 'put-off'; entry: Entry; cause: Error };

export interface Drained {
  sent: number;
  refused: number;
  /** Clips that are still on the device and will be tried again. */
  waiting: number;
  /** Why sending stopped before the end of the line; null when it did not. */
  stopped: Error | null;
}

/** What is wrong with this one clip. Others may be right. */
const OF_THE_CLIP = new Set([
  'body-invalid',
  'body-too-large',
  'media-type-refused',
  'media-type-unsupported',
  'recording-conflict',
  'recording-too-large',
  'bytes-mismatch',
]);

/** So many clips in a row that could not be sent, and the service is away: the rest waits. */
const AWAY_AFTER = 2;

export const isWaiting = ({ journal }: Entry): boolean =>
  journal.state === 'queued' || journal.state === 'slotted' || journal.state === 'put';

/**
 * Send what waits, oldest first. A clip that is refused stays on the device and out of the way; a device that is
 * refused (credential, state of service) stops, with its clips as they are.
 */
export async function drainQueue(
  device: Device,
  queue: Queue,
  onEvent: (event: QueueEvent) => void = () => undefined,
  signal?: AbortSignal,
): Promise<Drained> {
  const waiting = (await queue.list()).filter(isWaiting);
  const drained: Drained = { sent: 0, refused: 0, waiting: waiting.length, stopped: null };
  let inARow = 0;
  for (const entry of waiting) {
    if (signal?.aborted) break;
    const event = await sendEntry(device, queue, entry);
    onEvent(event);
    if (event.kind === 'put-off') {
      inARow++;
      if (!isOfThisClipOnly(event.cause) || inARow >= AWAY_AFTER) drained.stopped = event.cause;
      if (drained.stopped) break;
      continue;
    }
    inARow = 0;
    drained.waiting--;
    if (event.kind === 'sent') drained.sent++;
    else drained.refused++;
    if (event.kind === 'sent' && event.answer.renew) await renewQuietly(device);
  }
  return drained;
}

/** A clip that a broken line or a fault of the service kept back may be the only one: the next is tried. */
const isOfThisClipOnly = (cause: Error): boolean =>
  isPassing(cause) ||
  (cause instanceof ServiceProblem && ['bytes-missing', 'slot-ended', 'not-found'].includes(cause.code));

async function sendEntry(device: Device, queue: Queue, entry: Entry): Promise<QueueEvent> {
  const clip = await queue.clipOf(entry.place);
  if (!clip) {
    await queue.note(entry.place, {
      state: 'damaged',
      why: 'the bytes are no longer those that were recorded',
    });
    return { kind: 'damaged', entry };
  }
  try {
    const { answer } = await sendRecording(device, clip, {
      ...(entry.journal.state === 'put' ? { putAs: entry.journal.recording } : {}),
      onStep: (state, recording) => queue.note(entry.place, { state, recording }),
    });
    await queue.complete(entry, answer);
    return { kind: 'sent', entry, answer };
  } catch (error) {
    if (error instanceof ServiceProblem && OF_THE_CLIP.has(error.code)) {
      await queue.note(entry.place, { state: 'refused', code: error.code, title: error.problem.title });
      return { kind: 'refused', entry, problem: error };
    }
    if (error instanceof ServiceProblem || error instanceof NoAnswer)
      return { kind: 'put-off', entry, cause: error };
    throw error;
  }
}

/** Clips matter more than a renewal: it will be asked for again. */
async function renewQuietly(device: Device): Promise<void> {
  try {
    await renew(device);
  } catch (error) {
    if (!(error instanceof ServiceProblem) && !(error instanceof NoAnswer)) throw error;
  }
}
