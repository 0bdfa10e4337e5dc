import { RateLimiterMemory, RateLimiterRes } from 'rate-limiter-flexible';
import { Refusal } from '@/lib/platform/errors';

/** Calls a minute. An address is looser than a person: a whole hospital may stand behind one. */
const LIMITS = { person: 600, address: 1_800, 'address-writes': 120 } as const;
export type LimitName = keyof typeof LIMITS;

const WINDOW_SECONDS = 60;
const shared = globalThis as { bellkeepLimits?: Record<LimitName, RateLimiterMemory> };

const limiters = (): Record<LimitName, RateLimiterMemory> =>
  (shared.bellkeepLimits ??= Object.fromEntries(
    Object.entries(LIMITS).map(([keyPrefix, points]) => [
      keyPrefix,
      new RateLimiterMemory({ keyPrefix, points, duration: WINDOW_SECONDS }),
    ]),
  ) as Record<LimitName, RateLimiterMemory>);

/**
 * Count one call. The limits are of this process, which is enough against floods; sign-in has limits of its own in the
 * database.
 *
 * @returns fields that tell the caller what is left (RateLimit fields, draft-ietf-httpapi-ratelimit-headers)
 * @throws Refusal `too-many-requests` with Retry-After
 */
export async function spend(limit: LimitName, key: string): Promise<Record<string, string>> {
  const policy = `"${limit}";q=${LIMITS[limit]};w=${WINDOW_SECONDS}`;
  const fields = (left: RateLimiterRes, remaining: number) => ({
    'ratelimit-policy': policy,
    ratelimit: `"${limit}";r=${remaining};t=${Math.ceil(left.msBeforeNext / 1000)}`,
  });
  try {
    const left = await limiters()[limit].consume(key);
    return fields(left, left.remainingPoints);
  } catch (left) {
    if (!(left instanceof RateLimiterRes)) throw left;
    const seconds = Math.max(1, Math.ceil(left.msBeforeNext / 1000));
    throw new Refusal(
      'too-many-requests',
      `Too many calls. Wait ${seconds} s.`,
      {},
      { headers: { ...fields(left, 0), 'retry-after': String(seconds) } },
    );
  }
}
