import { FloatList, percentile } from '../dsp/percentile';
import type { Encoding, Probe } from '../types';

/** 0 dBFS is the RMS of a full-scale sine (AES17): a full-scale sine reads 0, a full-scale square wave +3.01. */
export const rmsToDbfsSine = (rms: number): number => 20 * Math.log10(rms * Math.SQRT2);
export const dbfsSineToRms = (dbfs: number): number => 10 ** (dbfs / 20) / Math.SQRT2;
export const toDbfs = (amplitude: number): number => 20 * Math.log10(amplitude);

const BLOCK_SECONDS = 0.1;
/** Energies kept for the context of dropouts. */
export const SHORT_SECONDS = 0.01;

/** Smallest step of a file's samples, in units of full scale; finer ones than 16 bit are judged as 16 bit. */
export function stepOf(encoding: Encoding, bitDepth: number | null): number {
  if (encoding === 'mulaw' || encoding === 'alaw') return 8 / 32_768;
  return 2 ** -(Math.min(bitDepth ?? 16, 16) - 1);
}

export interface LevelMeasures {
  dcFraction: number;
  peakDbfs: number | null;
  rmsDbfsSine: number | null;
  activeLevelDbfsSine: number | null;
  crestDb: number | null;
}

/** Told of every stretch of at most 10 ms: where it is in the array, and its extremes. */
export type StretchListener = (
  samples: Float32Array,
  from: number,
  to: number,
  min: number,
  max: number,
) => void;

/**
 * Sums of one channel in one pass: extremes, mean and mean square, and the same a 100 ms block and a 10 ms block.
 * DC is removed afterwards from the sums, in double precision: mean square less square of mean.
 */
export class LevelProbe implements Probe<LevelMeasures> {
  min = Number.POSITIVE_INFINITY;
  max = Number.NEGATIVE_INFINITY;
  frames = 0;
  readonly shortVariance = new FloatList();
  #sum = 0;
  #squares = 0;
  readonly #blockMean = new FloatList();
  readonly #blockSquare = new FloatList();
  readonly #short: number;
  readonly #shortsPerBlock = Math.round(BLOCK_SECONDS / SHORT_SECONDS);
  #n = 0;
  #s = 0;
  #q = 0;
  #shorts = 0;
  #blockSum = 0;
  #blockQ = 0;
  #blockN = 0;

  /** @param onStretch what needs extremes of a few samples to know whether to look at them */
  constructor(
    sampleRateHz: number,
    private readonly onStretch?: StretchListener,
  ) {
    this.#short = Math.max(1, Math.round(sampleRateHz * SHORT_SECONDS));
  }

  push(samples: Float32Array): void {
    let at = 0;
    while (at < samples.length) {
      const end = Math.min(samples.length, at + this.#short - this.#n);
      let s = 0;
      let q = 0;
      let min = samples[at] as number;
      let max = min;
      for (let i = at; i < end; i++) {
        const x = samples[i] as number;
        s += x;
        q += x * x;
        if (x < min) min = x;
        if (x > max) max = x;
      }
      if (min < this.min) this.min = min;
      if (max > this.max) this.max = max;
      this.onStretch?.(samples, at, end, min, max);
      this.#s += s;
      this.#q += q;
      this.#n += end - at;
      at = end;
      if (this.#n === this.#short) this.#closeShort();
    }
    this.frames += samples.length;
  }

  #closeShort(): void {
    const mean = this.#s / this.#n;
    this.shortVariance.push(Math.max(0, this.#q / this.#n - mean * mean));
    this.#sum += this.#s;
    this.#squares += this.#q;
    this.#blockSum += this.#s;
    this.#blockQ += this.#q;
    this.#blockN += this.#n;
    this.#n = 0;
    this.#s = 0;
    this.#q = 0;
    if (++this.#shorts === this.#shortsPerBlock) {
      this.#blockMean.push(this.#blockSum / this.#blockN);
      this.#blockSquare.push(this.#blockQ / this.#blockN);
      this.#shorts = 0;
      this.#blockSum = 0;
      this.#blockQ = 0;
      this.#blockN = 0;
    }
  }

  finish(): LevelMeasures {
    const sum = this.#sum + this.#s;
    const squares = this.#squares + this.#q;
    const dc = this.frames > 0 ? sum / this.frames : 0;
    // All samples equal: digital silence, whatever rounding leaves of the variance.
    if (this.frames === 0 || this.max === this.min)
      return {
        dcFraction: dc,
        peakDbfs: null,
        rmsDbfsSine: null,
        activeLevelDbfsSine: null,
        crestDb: null,
      };
    const rms = Math.sqrt(Math.max(0, squares / this.frames - dc * dc));
    const peak = Math.max(this.max - dc, dc - this.min);
    const active = this.#blockMean.length > 0 ? this.#activeRms(dc) : rms;
    return {
      dcFraction: dc,
      peakDbfs: toDbfs(peak),
      rmsDbfsSine: rms > 0 ? rmsToDbfsSine(rms) : null,
      activeLevelDbfsSine: active > 0 ? rmsToDbfsSine(active) : null,
      crestDb: rms > 0 ? toDbfs(peak / rms) : null,
    };
  }

  /** 90th percentile of the 100 ms blocks, the clip's DC taken out of each. */
  #activeRms(dc: number): number {
    const means = this.#blockMean.view();
    const blocks = this.#blockSquare
      .view()
      .map((q, i) => Math.sqrt(Math.max(0, q - 2 * dc * (means[i] as number) + dc * dc)));
    return percentile(blocks, 0.9);
  }
}
