/**
 * One second-order section, transposed direct form II, with its state. It starts as if its first sample had stood for
 * ever before, so that an offset makes no step.
 */
export class Biquad {
  #z1 = 0;
  #z2 = 0;
  #settled = false;

  constructor(
    private readonly b0: number,
    private readonly b1: number,
    private readonly b2: number,
    private readonly a1: number,
    private readonly a2: number,
  ) {}

  /** Filter `input` into `output` (may be the same array). */
  run(input: Float32Array, output: Float32Array, length = input.length): void {
    if (!this.#settled && length > 0) this.#settle(input[0] as number);
    const { b0, b1, b2, a1, a2 } = this;
    let z1 = this.#z1;
    let z2 = this.#z2;
    for (let i = 0; i < length; i++) {
      const x = input[i] as number;
      const y = b0 * x + z1;
      z1 = b1 * x - a1 * y + z2;
      z2 = b2 * x - a2 * y;
      output[i] = y;
    }
    // Denormals would make silence slow.
    this.#z1 = Math.abs(z1) < 1e-30 ? 0 : z1;
    this.#z2 = Math.abs(z2) < 1e-30 ? 0 : z2;
  }

  #settle(x: number): void {
    const y = (x * (this.b0 + this.b1 + this.b2)) / (1 + this.a1 + this.a2);
    this.#z1 = y - this.b0 * x;
    this.#z2 = this.b2 * x - this.a2 * y;
    this.#settled = true;
  }
}

/** Sections one behind the other, with the room their output needs. */
export class FilterChain {
  #buffer = new Float32Array(0);

  constructor(private readonly sections: readonly Biquad[]) {}

  /** @returns as many samples as went in; the next run writes over them */
  run(samples: Float32Array): Float32Array {
    const n = samples.length;
    if (this.#buffer.length < n) this.#buffer = new Float32Array(n);
    let input = samples;
    for (const section of this.sections) {
      section.run(input, this.#buffer, n);
      input = this.#buffer;
    }
    return this.#buffer;
  }
}

/**
 * Low- or high-pass with the bilinear transform of R. Bristow-Johnson's Audio EQ Cookbook (from memory).
 *
 * @param q 0.7071 for a Butterworth response
 */
export function passFilter(
  kind: 'low' | 'high',
  cutoffHz: number,
  sampleRateHz: number,
  q = Math.SQRT1_2,
): Biquad {
  const w = (2 * Math.PI * Math.min(cutoffHz, sampleRateHz * 0.49)) / sampleRateHz;
  const alpha = Math.sin(w) / (2 * q);
  const cos = Math.cos(w);
  const a0 = 1 + alpha;
  const b = kind === 'low' ? (1 - cos) / 2 : (1 + cos) / 2;
  const middle = kind === 'low' ? 1 - cos : -(1 + cos);
  return new Biquad(b / a0, middle / a0, b / a0, (-2 * cos) / a0, (1 - alpha) / a0);
}

export const highPass = (cutoffHz: number, sampleRateHz: number): Biquad =>
  passFilter('high', cutoffHz, sampleRateHz);
export const lowPass = (cutoffHz: number, sampleRateHz: number): Biquad =>
  passFilter('low', cutoffHz, sampleRateHz);
