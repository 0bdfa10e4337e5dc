import { type Kernels, SECTION_LENGTH } from '../kernels/types';

/** Coefficients of a second-order section, a0 = 1. */
export type Section = readonly [b0: number, b1: number, b2: number, a1: number, a2: number];

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
): Section {
  const w = (2 * Math.PI * Math.min(cutoffHz, sampleRateHz * 0.49)) / sampleRateHz;
  const alpha = Math.sin(w) / (2 * q);
  const cos = Math.cos(w);
  const a0 = 1 + alpha;
  const b = kind === 'low' ? (1 - cos) / 2 : (1 + cos) / 2;
  const middle = kind === 'low' ? 1 - cos : -(1 + cos);
  return [b / a0, middle / a0, b / a0, (-2 * cos) / a0, (1 - alpha) / a0];
}

export const highPass = (cutoffHz: number, sampleRateHz: number): Section =>
  passFilter('high', cutoffHz, sampleRateHz);
export const lowPass = (cutoffHz: number, sampleRateHz: number): Section =>
  passFilter('low', cutoffHz, sampleRateHz);

/** A section that changes nothing. */
export const PASS_ALL: Section = [1, 0, 0, 0, 0];

/**
 * Two or three sections one behind the other, with their state. It starts as if its first sample had stood for ever
 * before, so that an offset makes no step.
 */
export class FilterChain {
  readonly #state: Float64Array;
  #settled = false;

  constructor(
    private readonly kernels: Kernels,
    private readonly sections: readonly Section[],
  ) {
    if (sections.length < 2 || sections.length > 3) throw new RangeError('a chain has two or three sections');
    this.#state = kernels.arena.doubles(sections.length * SECTION_LENGTH);
    sections.forEach((section, k) => {
      this.#state.set(section, k * SECTION_LENGTH);
    });
  }

  /** Filter `samples` into `out`, which is as long and may be the same; both lie in the kernels' arena. */
  run(samples: Float32Array, out: Float32Array): void {
    if (samples.length === 0) return;
    if (!this.#settled) this.#settle(samples[0] as number);
    this.kernels.cascade(this.#state, samples, out);
  }

  #settle(first: number): void {
    settled(this.sections, first).forEach((z, k) => {
      this.#state.set(z, k * SECTION_LENGTH + 5);
    });
    this.#settled = true;
  }
}

/** States of sections one behind the other that have had one value for ever. */
function settled(sections: readonly Section[], first: number): [z1: number, z2: number][] {
  let x = first;
  return sections.map(([b0, b1, b2, a1, a2]) => {
    const y = (x * (b0 + b1 + b2)) / (1 + a1 + a2);
    const z: [number, number] = [y - b0 * x, b2 * x - a2 * y];
    x = y;
    return z;
  });
}

/** Two chains of three sections on one stream, at the price of little more than one. */
export class TwinChains {
  readonly #state: Float64Array;
  #settled = false;

  constructor(
    private readonly kernels: Kernels,
    private readonly chains: readonly [readonly Section[], readonly Section[]],
  ) {
    if (chains.some((sections) => sections.length !== 3))
      throw new RangeError('a twin chain has three sections');
    this.#state = kernels.arena.doubles(6 * SECTION_LENGTH);
    chains.forEach((sections, lane) => {
      sections.forEach((section, k) => {
        section.forEach((value, i) => {
          this.#state[2 * (k * SECTION_LENGTH + i) + lane] = value;
        });
      });
    });
  }

  /** All in the kernels' arena, of one length. */
  run(samples: Float32Array, first: Float32Array, second: Float32Array): void {
    if (samples.length === 0) return;
    if (!this.#settled) this.#settle(samples[0] as number);
    this.kernels.twins(this.#state, samples, first, second);
  }

  #settle(value: number): void {
    this.chains.forEach((sections, lane) => {
      settled(sections, value).forEach(([z1, z2], k) => {
        this.#state[2 * (k * SECTION_LENGTH + 5) + lane] = z1;
        this.#state[2 * (k * SECTION_LENGTH + 6) + lane] = z2;
      });
    });
    this.#settled = true;
  }
}
