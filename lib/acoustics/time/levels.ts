import { Framer } from '../dsp/framer';
import { FloatList, percentile } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';
import type { Encoding } from '../types';

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
  /** The largest of the sound between the samples too. */
  truePeakDbfs: number | null;
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
export class LevelProbe {
  min = Number.POSITIVE_INFINITY;
  max = Number.NEGATIVE_INFINITY;
  frames = 0;
  readonly shortVariance = new FloatList();
  #sum = 0;
  #squares = 0;
  readonly #blockMean = new FloatList();
  readonly #blockSquare = new FloatList();
  readonly #framer: Framer;
  readonly #sums: Float32Array;
  readonly #shortsPerBlock = Math.round(BLOCK_SECONDS / SHORT_SECONDS);
  #n = 0;
  #s = 0;
  #q = 0;
  #shorts = 0;
  #blockSum = 0;
  #blockQ = 0;
  #blockN = 0;

  /**
   * @param mostSamples that a push will bring
   * @param onStretch what needs extremes of a few samples to know whether to look at them
   */
  constructor(
    private readonly kernels: Kernels,
    sampleRateHz: number,
    mostSamples: number,
    private readonly onStretch?: StretchListener,
  ) {
    const short = Math.max(1, Math.round(sampleRateHz * SHORT_SECONDS));
    this.#framer = new Framer(short);
    this.#sums = kernels.arena.floats(4 * (Math.ceil(mostSamples / short) + 1));
  }

  /** @param samples in the kernels' arena */
  push(samples: Float32Array): void {
    this.#framer.push(
      samples,
      (part, ends) => {
        this.kernels.stretches(part, 1, part.length, this.#sums);
        this.#take(part, 0, 0, part.length);
        if (ends) this.#closeShort();
      },
      (frames, count) => {
        const { length } = this.#framer;
        this.kernels.stretches(frames, count, length, this.#sums);
        for (let k = 0; k < count; k++) {
          this.#take(frames, k, k * length, length);
          this.#closeShort();
        }
      },
    );
    this.frames += samples.length;
  }

  #take(samples: Float32Array, k: number, from: number, length: number): void {
    const sums = this.#sums;
    const min = sums[4 * k] as number;
    const max = sums[4 * k + 1] as number;
    // The kernel's sums are of the differences from the first sample: back to those of the samples, in double precision.
    const first = samples[from] as number;
    const sum = sums[4 * k + 2] as number;
    this.#s += sum + length * first;
    this.#q += (sums[4 * k + 3] as number) + first * (2 * sum + length * first);
    this.#n += length;
    if (min < this.min) this.min = min;
    if (max > this.max) this.max = max;
    this.onStretch?.(samples, from, from + length, min, max);
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

  /** @param reached extremes of the sound between the samples too */
  finish(reached: { min: number; max: number }): LevelMeasures {
    const sum = this.#sum + this.#s;
    const squares = this.#squares + this.#q;
    const dc = this.frames > 0 ? sum / this.frames : 0;
    // All samples equal: digital silence, whatever rounding leaves of the variance.
    if (this.frames === 0 || this.max === this.min)
      return {
        dcFraction: dc,
        peakDbfs: null,
        truePeakDbfs: null,
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
      truePeakDbfs: toDbfs(Math.max(reached.max - dc, dc - reached.min)),
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
