import { NoAnswer, ServiceProblem } from './answers';
import type { Device } from './device';

const FIRST_WAIT_MS = 250;
const LONGEST_WAIT_MS = 30_000;

/** Problems that time may heal. Everything else is the service's last word on this request. */
const PASSING = new Set(['too-many-requests', 'storage-unavailable', 'busy-elsewhere', 'fault']);

export const isPassing = (error: unknown): boolean =>
  error instanceof NoAnswer ||
  (error instanceof ServiceProblem &&
    (PASSING.has(error.code) || error.status >= 500 || error.status === 429 || error.status === 408));

/** Full jitter: anything from nothing to the doubled wait, so that a ward's devices do not come back in step. */
export const backoffMs = (attempt: number, random: () => number): number =>
  random() * Math.min(LONGEST_WAIT_MS, FIRST_WAIT_MS * 2 ** attempt);

/**
 * Do something until it works or is refused for good: exponential backoff with full jitter, and never sooner than
 * Retry-After says.
 */
export async function withRetry<T>(
  device: Pick<Device, 'sleep' | 'random'>,
  work: () => Promise<T>,
  tries = 8,
): Promise<T> {
  for (let attempt = 0; ; attempt++) {
    try {
      return await work();
    } catch (error) {
      if (!isPassing(error) || attempt + 1 >= tries) throw error;
      const asked =
        error instanceof ServiceProblem || error instanceof NoAnswer ? (error.retryAfterMs ?? 0) : 0;
      await device.sleep(Math.max(backoffMs(attempt, device.random), asked));
    }
  }
}
