import { FilterChain, highPass } from '../dsp/biquad';
import { percentile } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';
import type { Explosive } from '../types';

const THRESHOLD = 6;
/** Of a normal distribution: its standard deviation over its median absolute deviation. */
const MAD_TO_DEVIATION = 1.4826;
/** Full scale: nothing below it is heard as a burst. */
const LEAST_HEIGHT = 0.004;
/** Above the heart: its first sound would pass for a burst at 100 Hz. */
const HIGH_PASS_HZ = 150;
/** Deviation is estimated from every so many samples: it is a median of hundreds either way. */
const SAMPLED = 8;
const CONTEXT_SECONDS = 0.05;
const LONGEST_SECONDS = 0.025;
/** Below this rate an initial deflection is two or three samples: only the count and the time are told. */
const LEAST_RATE_FOR_WIDTH_HZ = 8000;
const LEAST_SAMPLES = 3;
const DENSEST_A_SECOND = 30;
const MOST = 500;
/** Onsets nearer to one another are of one burst. */
const SAME_SECONDS = 0.003;

/**
 * Short explosive places: above 150 Hz (twice), beyond 6 times the local median deviation, and back to it within 25 ms. The
 * initial deflection is from onset to the first crossing of zero, two cycles to the fourth. Published means: fine 0.7
 * and 5 ms, coarse 1.5 and 10 ms (ATS, after Piirila and Sovijarvi 1995). One- and two-sample spikes are clicks. False
 * friends: hair, gown, contact, dropouts; in a second with more than thirty it is not these, and nothing is told.
 */
export class ExplosiveProbe {
  readonly #filter: FilterChain;
  readonly #block: number;
  readonly #found: Explosive[] = [];
  readonly #filtered: Float32Array;
  readonly #work: Float32Array;
  readonly #largest: Float32Array;
  #kept = 0;
  #frames = 0;

  /** @param mostSamples that a push will bring */
  constructor(
    private readonly kernels: Kernels,
    private readonly rateHz: number,
    mostSamples: number,
  ) {
    this.#filter = new FilterChain(kernels, [highPass(HIGH_PASS_HZ, rateHz), highPass(HIGH_PASS_HZ, rateHz)]);
    this.#block = Math.round(CONTEXT_SECONDS * rateHz);
    this.#filtered = kernels.arena.floats(mostSamples);
    this.#work = kernels.arena.floats(mostSamples + 3 * this.#block);
    this.#largest = kernels.arena.floats(Math.ceil(mostSamples / this.#block) + 4);
  }

  /**
   * @param samples in the kernels' arena
   * @returns the same without what lies below 150 Hz, until the next push
   */
  push(samples: Float32Array): Float32Array {
    const block = this.#block;
    const total = this.#kept + samples.length;
    const high = this.#filtered.subarray(0, samples.length);
    this.#filter.run(samples, high);
    this.#work.set(high, this.#kept);
    const offset = this.#frames - this.#kept;
    // Each block is looked at with the one before and the one after it, so that an event is whole.
    const looks = Math.max(0, Math.floor(total / block) - 2);
    if (looks > 0)
      this.kernels.magnitudes(this.#work.subarray(block, (looks + 1) * block), looks, block, this.#largest);
    for (let k = 0; k < looks; k++) {
      const largest = this.#largest[k] as number;
      if (largest < LEAST_HEIGHT) continue;
      const x = this.#work.subarray(k * block, (k + 3) * block);
      // The deviation cannot be so small that the largest stands out, unless half lies that far below it.
      const half = this.kernels.countBelow(x, largest / (0.9 * THRESHOLD * MAD_TO_DEVIATION));
      if (half > x.length / 2) this.#look(x, offset + k * block);
    }
    this.#work.copyWithin(0, looks * block, total);
    this.#kept = total - looks * block;
    this.#frames += samples.length;
    return high;
  }

  /** @param x three blocks; events that begin in the middle one are told */
  #look(x: Float32Array, offset: number): void {
    const sampled: number[] = [];
    for (let i = 0; i < x.length; i += SAMPLED) sampled.push(Math.abs(x[i] as number));
    const deviation = percentile(sampled, 0.5) * MAD_TO_DEVIATION;
    const limit = Math.max(THRESHOLD * deviation, LEAST_HEIGHT);
    const longest = Math.round(LONGEST_SECONDS * this.rateHz);
    for (let i = this.#block; i < 2 * this.#block; i++) {
      if (Math.abs(x[i] as number) < limit) continue;
      // Risen within a millisecond: a breath swells, a burst does not.
      const before = Math.abs(x[Math.max(0, i - Math.ceil(this.rateHz / 1000))] as number);
      let end = i;
      for (let quiet = 0; end < x.length && quiet < this.rateHz * 0.004; end++)
        quiet = Math.abs(x[end] as number) < limit / 2 ? quiet + 1 : 0;
      const length = end - i;
      if (before < limit && length > LEAST_SAMPLES && length < longest + this.rateHz * 0.004)
        this.#note(x, i, offset);
      i = end;
    }
  }

  #note(x: Float32Array, at: number, offset: number): void {
    if (this.#found.length >= MOST) return;
    // Back to the crossing before the threshold was passed: the onset.
    let onset = at;
    const sign = Math.sign(x[at] as number);
    while (onset > 0 && Math.sign(x[onset - 1] as number) === sign && at - onset < this.rateHz * 0.002)
      onset--;
    const crossings: number[] = [];
    for (let i = onset + 1; i < x.length && crossings.length < 4; i++) {
      const [a, b] = [x[i - 1] as number, x[i] as number];
      if (a !== 0 && Math.sign(a) !== Math.sign(b)) crossings.push(i - 1 + a / (a - b));
    }
    const ms = (crossing: number | undefined) =>
      crossing === undefined || this.rateHz < LEAST_RATE_FOR_WIDTH_HZ
        ? null
        : ((crossing - onset) / this.rateHz) * 1000;
    const startSeconds = (offset + onset) / this.rateHz;
    // A burst that reaches into the next block has its onset in this one.
    const last = this.#found.at(-1);
    if (last && startSeconds - last.startSeconds < SAME_SECONDS) return;
    this.#found.push({
      startSeconds,
      initialDeflectionMs: ms(crossings[0]),
      twoCycleMs: ms(crossings[3]),
    });
  }

  finish(): Explosive[] {
    const seconds = new Map<number, number>();
    for (const { startSeconds } of this.#found)
      seconds.set(Math.floor(startSeconds), (seconds.get(Math.floor(startSeconds)) ?? 0) + 1);
    return this.#found.filter(
      ({ startSeconds }) => (seconds.get(Math.floor(startSeconds)) ?? 0) <= DENSEST_A_SECOND,
    );
  }
}
