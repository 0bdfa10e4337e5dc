import { RateLimiterMemory, RateLimiterRes } from 'rate-limiter-flexible';

/** Wrong tries for one account from one address, and for one account from everywhere, before one has to wait. */
const SAME_ADDRESS = new RateLimiterMemory({
  keyPrefix: 'sign-in-here',
  points: 5,
  duration: 15 * 60,
  blockDuration: 15 * 60,
});
const ANY_ADDRESS = new RateLimiterMemory({
  keyPrefix: 'sign-in',
  points: 50,
  duration: 60 * 60,
  blockDuration: 15 * 60,
});

const here = (account: string, address: string) => `${account} ${address}`;

/** Seconds to wait before this account may be tried again from this address; 0 when it may. */
export async function secondsToWait(account: string, address: string): Promise<number> {
  const [one, all] = await Promise.all([SAME_ADDRESS.get(here(account, address)), ANY_ADDRESS.get(account)]);
  const waits = [
    one && one.consumedPoints > 5 ? one.msBeforeNext : 0,
    all && all.consumedPoints > 50 ? all.msBeforeNext : 0,
    one && one.remainingPoints <= 0 ? one.msBeforeNext : 0,
  ];
  return Math.ceil(Math.max(...waits) / 1000);
}

export async function countWrongTry(account: string, address: string): Promise<void> {
  for (const [limiter, key] of [
    [SAME_ADDRESS, here(account, address)],
    [ANY_ADDRESS, account],
  ] as const) {
    await limiter.consume(key).catch((left: unknown) => {
      if (!(left instanceof RateLimiterRes)) throw left;
    });
  }
}

export async function forgetTries(account: string, address: string): Promise<void> {
  await SAME_ADDRESS.delete(here(account, address));
}
