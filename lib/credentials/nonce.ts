import { createHmac, timingSafeEqual } from 'node:crypto';
import type { Services } from '@/lib/platform/services';

/** A nonce is good for its own five minutes and the next five: long enough for a slow upload, short enough to bound replay. */
const WINDOW_MS = 300_000;

const nonceOf = (services: Pick<Services, 'env'>, window: number): string =>
  createHmac('sha256', Buffer.from(services.env.BELLKEEP_SECRET_KEY, 'base64'))
    .update(`dpop nonce ${window}`)
    .digest('base64url')
    .slice(0, 27);

/**
 * The nonce that proofs must carry (RFC 9449, 8): the time window under a key of the service, so that every
 * process agrees without storing it and a device's own clock does not matter.
 */
export const currentNonce = (services: Pick<Services, 'env' | 'clock'>): string =>
  nonceOf(services, Math.floor(services.clock.now() / WINDOW_MS));

export function isFreshNonce(services: Pick<Services, 'env' | 'clock'>, nonce: unknown): boolean {
  if (typeof nonce !== 'string') return false;
  const window = Math.floor(services.clock.now() / WINDOW_MS);
  return [window, window - 1].some((w) => {
    const expected = Buffer.from(nonceOf(services, w));
    const given = Buffer.from(nonce);
    return expected.length === given.length && timingSafeEqual(expected, given);
  });
}

/** Until when a proof's `jti` must be remembered: as long as its nonce could be fresh. */
export const proofMemoryMs = 2 * WINDOW_MS;
