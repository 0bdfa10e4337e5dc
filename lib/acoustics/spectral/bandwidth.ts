import { percentile } from '../dsp/percentile';
import { planSpectrum, type SpectrumPlan } from '../kernels/plan';
import type { Kernels } from '../kernels/types';

const SIZE = 1024;
const BINS = SIZE / 2 + 1;
/** Spectra are made four at a time. */
const TOGETHER = 4;
/** Segments looked at in a long clip: enough for a steady estimate, few enough to cost little. */
const EVERY_SECONDS = 0.25;
const LEAST_FALL_DB = 30;
const LOWEST_EDGE_HZ = 300;
const HIGHEST_EDGE = 0.95;
const TAIL_WITHIN_DB = 6;

export interface Bandwidth {
  /** Where the content stops; null for a clip too short or silent. */
  bandwidthHz: number | null;
  brickWall: boolean;
  upsampled: boolean;
}

/**
 * How far up there is sound, from a Welch spectrum (1967; Hann, sparse segments) at the file's own rate.
 *
 * Brick wall: the largest fall of the median-filtered spectrum within 3 % of Nyquist is 30 dB or more, between 300 Hz
 * and 0.95 Nyquist, and what lies beyond is within 6 dB of the quantisation density -10 lg 12 - 20 lg 2^(b-1) -
 * 10 lg(fs/2). Heart-only clips fall 55 dB at 113 Hz, hence the 300 Hz. Not seen: MP3 in disguise.
 */
export class BandwidthProbe {
  readonly #plan: SpectrumPlan;
  readonly #sum = new Float64Array(BINS);
  readonly #frames: Float32Array;
  readonly #power: Float32Array;
  readonly #every: number;
  /** Samples gathered of the next four segments. */
  #filled = 0;
  #skip = 0;
  #segments = 0;

  constructor(
    private readonly kernels: Kernels,
    private readonly rateHz: number,
    private readonly bitDepth: number | null,
  ) {
    this.#every = Math.max(0, Math.round(EVERY_SECONDS * rateHz) - SIZE);
    this.#plan = planSpectrum(kernels.arena, SIZE, BINS);
    this.#frames = kernels.arena.floats(TOGETHER * SIZE);
    this.#power = kernels.arena.floats(TOGETHER * BINS);
  }

  push(samples: Float32Array): void {
    for (let at = 0; at < samples.length; ) {
      if (this.#skip > 0) {
        const skipped = Math.min(this.#skip, samples.length - at);
        this.#skip -= skipped;
        at += skipped;
        continue;
      }
      const taken = Math.min(SIZE - (this.#filled % SIZE), samples.length - at);
      this.#frames.set(samples.subarray(at, at + taken), this.#filled);
      this.#filled += taken;
      at += taken;
      if (this.#filled % SIZE === 0) this.#skip = this.#every;
      if (this.#filled === TOGETHER * SIZE) this.#transform(TOGETHER);
    }
  }

  #transform(count: number): void {
    this.kernels.spectra(this.#plan, this.#frames, SIZE, count, this.#power);
    for (let s = 0; s < count; s++)
      for (let k = 0; k < BINS; k++)
        this.#sum[k] = (this.#sum[k] as number) + (this.#power[s * BINS + k] as number);
    this.#segments += count;
    this.#filled = 0;
  }

  finish(): Bandwidth {
    const whole = Math.floor(this.#filled / SIZE);
    if (whole > 0) this.#transform(whole);
    if (this.#segments === 0) return { bandwidthHz: null, brickWall: false, upsampled: false };
    // Periodogram density, doubled for the negative frequencies; sum of squared Hann is 3/8 of its length.
    const scale = 2 / (this.#segments * this.rateHz * SIZE * 0.375);
    const db = medianFiltered(
      this.#sum.map((power) => 10 * Math.log10(power * scale + 1e-20)),
      4,
    );
    const nyquist = this.rateHz / 2;
    const binHz = this.rateHz / SIZE;
    const reach = Math.max(2, Math.round((0.03 * nyquist) / binHz));
    let fall = 0;
    let edge = 0;
    for (let k = reach; k + reach < db.length; k++) {
      const drop = (db[k] as number) - (db[k + reach] as number);
      if (drop > fall) {
        fall = drop;
        edge = k + reach / 2;
      }
    }
    const edgeHz = edge * binHz;
    const tail = percentile(db.subarray(Math.min(db.length - 1, Math.ceil(edge + reach))), 0.5);
    const codes = 2 ** (Math.min(this.bitDepth ?? 16, 16) - 1);
    const quantisation = -10 * Math.log10(12) - 20 * Math.log10(codes) - 10 * Math.log10(nyquist);
    const brickWall = fall >= LEAST_FALL_DB && edgeHz > LOWEST_EDGE_HZ && edgeHz < HIGHEST_EDGE * nyquist;
    return {
      bandwidthHz: brickWall ? edgeHz : contentEnd(db, binHz, quantisation),
      brickWall,
      upsampled: brickWall && tail < quantisation + TAIL_WITHIN_DB,
    };
  }
}

/** Highest frequency that stands 10 dB above the quantisation. */
function contentEnd(db: Float64Array, binHz: number, quantisation: number): number {
  let last = 0;
  for (let k = 0; k < db.length; k++) if ((db[k] as number) > quantisation + 10) last = k;
  return last * binHz;
}

/** Median of each value and `half` neighbours on both sides, by a window that is kept sorted. */
function medianFiltered(values: Float64Array, half: number): Float64Array {
  const window = new Float64Array(2 * half + 2);
  let n = 0;
  const out = new Float64Array(values.length);
  for (let k = -half; k < values.length; k++) {
    if (k - half > 0) {
      const leaves = values[k - half - 1] as number;
      let at = 0;
      while (at < n - 1 && window[at] !== leaves) at++;
      window.copyWithin(at, at + 1, n--);
    }
    if (k + half < values.length) {
      const enters = values[k + half] as number;
      let at = n++;
      for (; at > 0 && (window[at - 1] as number) > enters; at--) window[at] = window[at - 1] as number;
      window[at] = enters;
    }
    if (k >= 0) out[k] = window[n >> 1] as number;
  }
  return out;
}
