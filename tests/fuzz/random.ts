/** A small generator of numbers that a seed decides (mulberry32, public domain), so that every case can be had again. */
export class Random {
  #state: number;

  constructor(seed: number) {
    this.#state = seed >>> 0;
  }

  /** 0 up to, not including, `below`. */
  int(below: number): number {
    this.#state = (this.#state + 0x6d2b_79f5) >>> 0;
    let t = this.#state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return Math.floor((((t ^ (t >>> 14)) >>> 0) / 2 ** 32) * below);
  }

  of<T>(list: readonly T[]): T {
    return list[this.int(list.length)] as T;
  }

  chance(oneIn: number): boolean {
    return this.int(oneIn) === 0;
  }
}
