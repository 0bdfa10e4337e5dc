import type { Kernels } from '../kernels/types';

/**
 * Taps of a low-pass for division by `factor`: windowed sinc (Blackman), gain 1.
 *
 * @param tapsPerPhase taps for each input sample skipped: 16 pass to 0.37 of the new rate and stop from 0.63; fewer
 * have a wider transition (5.5 over their number)
 */
function lowPassTaps(factor: number, tapsPerPhase: number): Float32Array {
  const length = factor * tapsPerPhase + 1;
  const middle = (length - 1) / 2;
  const cutoff = 0.46 / factor;
  const taps = Float64Array.from({ length }, (_, i) => {
    const t = i - middle;
    const sinc = t === 0 ? 2 * cutoff : Math.sin(2 * Math.PI * cutoff * t) / (Math.PI * t);
    const turn = (2 * Math.PI * i) / (length - 1);
    return sinc * (0.42 - 0.5 * Math.cos(turn) + 0.08 * Math.cos(2 * turn));
  });
  const sum = taps.reduce((a, b) => a + b, 0);
  return Float32Array.from(taps, (tap) => tap / sum);
}

const made = new Map<string, Float32Array>();
function tapsOf(factor: number, tapsPerPhase: number): Float32Array {
  const key = `${factor} ${tapsPerPhase}`;
  const taps = made.get(key) ?? lowPassTaps(factor, tapsPerPhase);
  made.set(key, taps);
  return taps;
}

/**
 * Divide the sample rate by a whole factor behind a low-pass. Streaming: each push gives as many samples as are
 * complete. Output sample k stands for input sample k * factor.
 */
export class Decimator {
  readonly #taps: Float32Array;
  readonly #length: number;
  readonly #history: Float32Array;
  readonly #out: Float32Array;
  #kept: number;
  #skip = 0;
  #begun = false;

  /** @param mostSamples that a push will bring */
  constructor(
    private readonly kernels: Kernels,
    readonly factor: number,
    mostSamples: number,
    tapsPerPhase = 16,
  ) {
    const taps = factor === 1 ? new Float32Array(1) : tapsOf(factor, tapsPerPhase);
    this.#length = taps.length;
    // A multiple of four, with zeros at the end.
    this.#taps = kernels.arena.floats(Math.ceil(taps.length / 4) * 4);
    this.#taps.set(taps);
    this.#history = kernels.arena.floats(factor === 1 ? 4 : mostSamples + taps.length + factor + 4);
    this.#out = kernels.arena.floats(factor === 1 ? 4 : Math.ceil(mostSamples / factor) + 2);
    // Half a filter of the first sample stands before it, so that an offset makes no step.
    this.#kept = Math.floor((taps.length - 1) / 2);
  }

  /** @returns a view that the next push writes over; with a factor of 1 the samples themselves */
  push(samples: Float32Array): Float32Array {
    if (this.factor === 1) return samples;
    const x = this.#history;
    const total = this.#kept + samples.length;
    if (!this.#begun && samples.length > 0) {
      x.fill(samples[0] as number, 0, this.#kept);
      this.#begun = true;
    }
    x.set(samples, this.#kept);
    const outputs = Math.max(0, Math.floor((total - this.#length - this.#skip) / this.factor) + 1);
    if (outputs > 0) this.kernels.dots(this.#taps, x, this.#skip, this.factor, outputs, this.#out);
    const at = this.#skip + outputs * this.factor;
    const keepFrom = Math.min(total, at);
    this.#skip = at - keepFrom;
    x.copyWithin(0, keepFrom, total);
    this.#kept = total - keepFrom;
    return this.#out.subarray(0, outputs);
  }
}
