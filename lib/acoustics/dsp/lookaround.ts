import type { Kernels } from '../kernels/types';

/**
 * A stream in which each sample is seen once with `reach` samples on both sides. The first and last `reach` samples of
 * a stream are not.
 */
export class Lookaround {
  readonly x: Float32Array;
  /** Samples of x from `reach` up to `to` are to be looked at after a push. */
  to: number;
  /** Frame of the stream that sample 0 of x is. */
  offset = 0;
  #kept = 0;
  #total = 0;

  constructor(
    kernels: Kernels,
    readonly reach: number,
    mostSamples: number,
  ) {
    this.x = kernels.arena.floats(mostSamples + 2 * reach);
    this.to = reach;
  }

  push(samples: Float32Array): void {
    this.x.copyWithin(0, this.#total - this.#kept, this.#total);
    this.offset += this.#total - this.#kept;
    this.x.set(samples, this.#kept);
    this.#total = this.#kept + samples.length;
    this.to = Math.max(this.reach, this.#total - this.reach);
    this.#kept = Math.min(this.#total, 2 * this.reach);
  }
}
