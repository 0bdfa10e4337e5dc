/** Taps for each input sample skipped: sets the width of the transition. */
const TAPS_PER_PHASE = 16;

/**
 * How far a rate may be divided for the measures that live below 2 kHz: the result stays at 4.4 kHz or above.
 *
 * @returns 1: not at all
 */
export const decimationFor = (sampleRateHz: number): number => Math.max(1, Math.floor(sampleRateHz / 4400));

/**
 * Divide the sample rate by a whole factor behind a windowed-sinc low-pass (Blackman; pass band to 0.42 of the new
 * rate). Streaming: each push gives as many samples as are complete.
 */
export class Decimator {
  readonly #taps: Float32Array;
  #history: Float32Array;
  #kept = 0;
  #skip = 0;
  #begun = false;
  #out = new Float32Array(4096);

  constructor(readonly factor: number) {
    const length = factor === 1 ? 1 : factor * TAPS_PER_PHASE + 1;
    this.#taps = new Float32Array(length);
    const middle = (length - 1) / 2;
    const cutoff = 0.46 / factor;
    let sum = 0;
    for (let i = 0; i < length; i++) {
      const t = i - middle;
      const sinc = t === 0 ? 2 * cutoff : Math.sin(2 * Math.PI * cutoff * t) / (Math.PI * t);
      const window =
        length === 1
          ? 1
          : 0.42 -
            0.5 * Math.cos((2 * Math.PI * i) / (length - 1)) +
            0.08 * Math.cos((4 * Math.PI * i) / (length - 1));
      this.#taps[i] = sinc * window;
      sum += this.#taps[i] as number;
    }
    for (let i = 0; i < length; i++) this.#taps[i] = (this.#taps[i] as number) / sum;
    this.#history = new Float32Array(length);
    // Half a filter of the first sample stands before it, so that an offset makes no step; output sample k stands for
    // input sample k * factor.
    this.#kept = Math.floor(middle);
  }

  /** @returns a view that the next push writes over */
  push(samples: Float32Array): Float32Array {
    if (this.factor === 1) return samples;
    const length = this.#taps.length;
    const total = this.#kept + samples.length;
    if (this.#history.length < total) {
      const grown = new Float32Array(total + 4096);
      grown.set(this.#history.subarray(0, this.#kept));
      this.#history = grown;
    }
    const x = this.#history;
    if (!this.#begun && samples.length > 0) {
      x.fill(samples[0] as number, 0, this.#kept);
      this.#begun = true;
    }
    x.set(samples, this.#kept);
    const outputs = Math.max(0, Math.floor((total - length - this.#skip) / this.factor) + 1);
    if (this.#out.length < outputs) this.#out = new Float32Array(outputs + 1024);
    let at = this.#skip;
    for (let k = 0; k < outputs; k++, at += this.factor) this.#out[k] = this.#dot(x, at);
    const keepFrom = Math.min(total, at);
    this.#skip = at - keepFrom;
    x.copyWithin(0, keepFrom, total);
    this.#kept = total - keepFrom;
    return this.#out.subarray(0, outputs);
  }

  /** The taps are symmetric: each pair of samples is added before it is weighed. */
  #dot(x: Float32Array, at: number): number {
    const taps = this.#taps;
    const last = taps.length - 1;
    const middle = last >> 1;
    let sum = (taps[middle] as number) * (x[at + middle] as number);
    for (let i = 0; i < middle; i++)
      sum += (taps[i] as number) * ((x[at + i] as number) + (x[at + last - i] as number));
    return sum;
  }
}
