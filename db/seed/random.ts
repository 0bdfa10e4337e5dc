/** A small seeded generator (mulberry32, Tommy Ettinger 2017, from memory), so that the demo house is the same each time. */
export function createRandom(seed: number) {
  let state = seed >>> 0;
  const next = (): number => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return ((t ^ (t >>> 14)) >>> 0) / 4_294_967_296;
  };
  const pick = <T>(from: readonly T[]): T => from[Math.floor(next() * from.length)] as T;
  return {
    next,
    pick,
    /** A whole number from `low` to `high`, both included. */
    whole: (low: number, high: number): number => low + Math.floor(next() * (high - low + 1)),
    chance: (probability: number): boolean => next() < probability,
  };
}
export type Random = ReturnType<typeof createRandom>;
