import type { Dropout } from '../types';
import { SHORT_SECONDS } from './levels';

/** Runs kept for judging at the end; a file with more is broken beyond counting. */
const MOST_RUNS = 20_000;
const SHORTEST_SECONDS = 0.001;
const SHORTEST_SAMPLES = 8;
/** A run this long needs no jump at its edge to be a hole in the sound. */
const LONG_SECONDS = 0.02;
const CONTEXT_BLOCKS = 5;

interface Run {
  start: number;
  length: number;
  value: number;
  /** The larger step at its two edges. */
  jump: number;
}

/**
 * Holes: runs of equal samples, of at least 8 samples and 1 ms, with sound on both sides (50 ms of more than 4 steps
 * RMS each). Quiet quantised content also stands still, and so does the top of a slow wave, so a short run must
 * begin or end with a jump that the sound around it explains. Consecutive-sample practice, general (from memory);
 * the jump rule is ours. Runs at the rail or at the signal's own extreme are clipping, and not counted here.
 */
export class DropoutProbe {
  readonly #runs: Run[] = [];
  readonly #shortest: number;
  #value = Number.NaN;
  #length = 0;
  #frames = 0;
  #jumpIn = 0;

  constructor(
    private readonly sampleRateHz: number,
    private readonly step: number,
    private readonly coarse: boolean,
  ) {
    this.#shortest = Math.max(SHORTEST_SAMPLES, Math.ceil(sampleRateHz * SHORTEST_SECONDS));
  }

  push(samples: Float32Array): void {
    let value = this.#value;
    let length = this.#length;
    for (let i = 0; i < samples.length; i++) {
      const x = samples[i] as number;
      if (x === value) {
        length++;
        continue;
      }
      if (length >= this.#shortest) this.#close(this.#frames + i, length, value, Math.abs(x - value));
      this.#jumpIn = Math.abs(x - value);
      value = x;
      length = 1;
    }
    this.#value = value;
    this.#length = length;
    this.#frames += samples.length;
  }

  #close(end: number, length: number, value: number, jumpOut: number): void {
    if (this.#runs.length < MOST_RUNS)
      this.#runs.push({ start: end - length, length, value, jump: Math.max(this.#jumpIn, jumpOut) });
  }

  /**
   * @param shortVariance variance a 10 ms block, from LevelProbe
   * @param extremes smallest and largest sample of the channel
   */
  finish(shortVariance: Float32Array, extremes: { min: number; max: number }): Dropout[] {
    const block = Math.max(1, Math.round(this.sampleRateHz * SHORT_SECONDS));
    const context = (from: number): number => {
      let sum = 0;
      let n = 0;
      for (let b = from; b < from + CONTEXT_BLOCKS; b++) {
        if (b < 0 || b >= shortVariance.length) continue;
        sum += shortVariance[b] as number;
        n++;
      }
      return n === 0 ? 0 : Math.sqrt(sum / n);
    };
    return this.#runs
      .filter((run) => {
        const atExtreme =
          run.value >= extremes.max - 1.5 * this.step || run.value <= extremes.min + 1.5 * this.step;
        if (run.value !== 0 && atExtreme) return false;
        const before = context(Math.floor(run.start / block) - CONTEXT_BLOCKS);
        const after = context(Math.floor((run.start + run.length) / block) + 1);
        if (before <= 4 * this.step || after <= 4 * this.step) return false;
        const seconds = run.length / this.sampleRateHz;
        if (seconds >= LONG_SECONDS) return true;
        if (this.coarse) return false;
        return run.jump > Math.max(4 * this.step, (run.value === 0 ? 0.1 : 0.25) * Math.min(before, after));
      })
      .map((run) => ({
        kind: run.value === 0 ? 'zero' : 'held',
        startSeconds: run.start / this.sampleRateHz,
        lengthSamples: run.length,
      }));
  }
}
