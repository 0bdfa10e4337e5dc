import type { Arena } from './arena';
import type { SpectrumPlan } from './plan';

/** Coefficients and state of one second-order section in a row: b0 b1 b2 a1 a2 z1 z2. */
export const SECTION_LENGTH = 7;

/**
 * The loops that take the time, over arrays of one arena. There are two implementations, WebAssembly with SIMD and
 * plain TypeScript; they agree within the rounding of single precision, which tests hold them to.
 */
export interface Kernels {
  readonly kind: 'wasm' | 'plain';
  readonly arena: Arena;

  /**
   * Of `count` stretches of `length` samples: smallest, largest, sum and sum of squares of the differences from the
   * stretch's first sample (which loses nothing to an offset). @param out four values a stretch
   */
  stretches(x: Float32Array, count: number, length: number, out: Float32Array): void;
  /** Sum of squares of each of `count` stretches. */
  energies(x: Float32Array, count: number, length: number, out: Float32Array): void;
  /** Smallest and largest of each of `count` buckets. @param bucket a multiple of 8 */
  extremes(x: Float32Array, count: number, bucket: number, out: Float32Array): void;
  /** Largest magnitude of each of `count` stretches. */
  magnitudes(x: Float32Array, count: number, length: number, out: Float32Array): void;
  /** How many values are at most `limit` in magnitude. */
  countBelow(x: Float32Array, limit: number): number;
  /**
   * Sum and largest of |2 x[i] - x[i-1] - x[i+1]| for i from `at` on, in runs of `run`, the first of `first`.
   *
   * @param x read from `at - 1` to `at + n`; @returns how many runs
   */
  bends(x: Float32Array, at: number, n: number, first: number, run: number, out: Float32Array): number;
  /** One channel of interleaved 16-bit codes, in units of full scale. */
  spread16(codes: Int16Array, channel: number, channels: number, frames: number, out: Float32Array): void;
  /** Weighed sums of `count` places of x, `step` apart. @param taps length a multiple of 4 */
  dots(taps: Float32Array, x: Float32Array, at: number, step: number, count: number, out: Float32Array): void;
  /**
   * Largest and smallest of the sound between samples, by four filters of 12 taps, beside those of x from `at` on that
   * reach `gate` in magnitude and are no smaller than their neighbours. @param taps tap by tap, four phases each; @param x read from at - 6 to at + n + 6
   * @param out raised to what is larger, lowered to what is smaller
   */
  betweenSamples(
    taps: Float32Array,
    x: Float32Array,
    at: number,
    n: number,
    gate: number,
    out: Float32Array,
  ): void;
  /** Two or three second-order sections one behind the other; `sections` holds their state. */
  cascade(sections: Float64Array, x: Float32Array, out: Float32Array): void;
  /** Two chains of three sections on one input; `sections` holds their values side by side. */
  twins(sections: Float64Array, x: Float32Array, first: Float32Array, second: Float32Array): void;
  /** |X|^2 of `count` windowed frames that begin `hop` apart, `plan.bins` values a frame. */
  spectra(plan: SpectrumPlan, x: Float32Array, hop: number, count: number, out: Float32Array): void;
  /** 10 lg(power * scale + least) as bytes of `step` decibels above `floor`. @param out as long as power */
  shades(
    power: Float32Array,
    scale: number,
    least: number,
    floor: number,
    step: number,
    out: Uint8Array,
  ): void;
  /**
   * Local maxima of each row between bins `low` and `high`, no lower than `least`, of whose neighbours within `reach`
   * bins more than half lie `over` shades or more below. @param out of each its row, its bin, and the median shade within
   * reach; @returns how many
   */
  standouts(shades: Uint8Array, rows: number, bins: number, search: StandoutSearch, out: Int32Array): number;
  /** Sum of bins `from` up to and without `to` of each row. */
  bandSums(
    power: Float32Array,
    rows: number,
    bins: number,
    from: number,
    to: number,
    out: Float32Array,
  ): void;
  /** Sums of x[i] x[i + lag] for lags `from` to `to`. */
  lagged(x: Float32Array, from: number, to: number, out: Float32Array): void;
}

export interface StandoutSearch {
  low: number;
  high: number;
  reach: number;
  least: number;
  over: number;
}
