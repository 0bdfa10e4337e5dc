import { createHmac } from 'node:crypto';
import { isIPv4, isIPv6 } from 'node:net';
import { eq, inArray, sql } from 'drizzle-orm';
import { signInTry } from '@/db/schema';
import type { Services } from '@/lib/platform/services';

/** Wrong tries before one has to wait, how long the first wait is, and how long the longest; each doubles the last. */
interface Limit {
  tries: number;
  firstWaitMs: number;
  longestWaitMs: number;
  /** Tries are forgotten after so long without one. */
  forgetMs: number;
}
const SAME_ADDRESS: Limit = {
  tries: 5,
  firstWaitMs: 30_000,
  longestWaitMs: 3_600_000,
  forgetMs: 24 * 3_600_000,
};
/** Looser, because it lets a stranger keep somebody out of their own account. */
const ANY_ADDRESS: Limit = {
  tries: 50,
  firstWaitMs: 30_000,
  longestWaitMs: 900_000,
  forgetMs: 3_600_000,
};

type Needs = Pick<Services, 'write' | 'clock' | 'env'>;

/** Addresses that one subscriber holds count as one: an IPv6 network of 64 bits, or a single IPv4 address. */
export function addressGroup(address: string): string {
  const mapped = /^::ffff:(\d+\.\d+\.\d+\.\d+)$/i.exec(address)?.[1];
  if (mapped && isIPv4(mapped)) return mapped;
  if (!isIPv6(address)) return address;
  const [head = '', tail] = (address.split('%')[0] ?? '').split('::');
  const before = head.split(':').filter(Boolean);
  const after = (tail ?? '').split(':').filter(Boolean);
  const missing = tail === undefined ? 0 : 8 - before.length - after.length;
  const groups = [...before, ...Array.from({ length: Math.max(0, missing) }, () => '0'), ...after];
  return `${groups
    .slice(0, 4)
    .map((group) => Number.parseInt(group, 16).toString(16))
    .join(':')}::/64`;
}

/** HMAC, so that an address that somebody mistyped or made up is not kept. */
const keyed = (services: Pick<Services, 'env'>, ...parts: string[]): string =>
  createHmac('sha256', services.env.BELLKEEP_AUTH_SECRET).update(parts.join('\0')).digest('hex');

function keysOf(services: Pick<Services, 'env'>, account: string, address: string) {
  return {
    here: keyed(services, 'try-here', account, addressGroup(address)),
    anywhere: keyed(services, 'try-anywhere', account),
  };
}

export const waitAfter = (wrong: number, limit: Limit): number =>
  wrong < limit.tries ? 0 : Math.min(limit.longestWaitMs, limit.firstWaitMs * 2 ** (wrong - limit.tries));

/**
 * Take one try at an account. It counts as wrong until `tryWasRight` says otherwise, so that many at the same moment
 * are not one.
 *
 * @returns seconds to wait before the next try; 0 when this one may go on
 */
export function takeTry(services: Needs, account: string, address: string): Promise<number> {
  const keys = keysOf(services, account, address);
  const now = services.clock.now();
  return services.write(async (tx) => {
    const rows = await tx
      .select()
      .from(signInTry)
      .where(inArray(signInTry.key, [keys.here, keys.anywhere]));
    const wait = Math.max(0, ...rows.map((row) => row.waitUntil - now));
    if (wait > 0) return Math.ceil(wait / 1000);
    for (const [key, limit] of [
      [keys.here, SAME_ADDRESS],
      [keys.anywhere, ANY_ADDRESS],
    ] as const) {
      const before = rows.find((row) => row.key === key);
      const wrong = (before && now - before.lastAt < limit.forgetMs ? before.wrong : 0) + 1;
      const row = { wrong, lastAt: now, waitUntil: now + waitAfter(wrong, limit) };
      await tx
        .insert(signInTry)
        .values({ key, ...row })
        .onConflictDoUpdate({ target: signInTry.key, set: row });
    }
    return 0;
  });
}

/** The try that was taken last was right: those from here are forgotten, and it is no wrong one anywhere. */
export async function tryWasRight(services: Needs, account: string, address: string): Promise<void> {
  const keys = keysOf(services, account, address);
  await services.write(async (tx) => {
    await tx.delete(signInTry).where(eq(signInTry.key, keys.here));
    await tx
      .update(signInTry)
      .set({ wrong: sql`max(0, ${signInTry.wrong} - 1)`, waitUntil: 0 })
      .where(eq(signInTry.key, keys.anywhere));
  });
}
