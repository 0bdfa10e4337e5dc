/** One second-order section, transposed direct form II, with its state. */
export class Biquad {
  #z1 = 0;
  #z2 = 0;
  constructor(
    private readonly b0: number,
    private readonly b1: number,
    private readonly b2: number,
    private readonly a1: number,
    private readonly a2: number,
  ) {}

  /** Filter `input` into `output` (may be the same array). */
  run(input: Float32Array, output: Float32Array, length = input.length): void {
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
