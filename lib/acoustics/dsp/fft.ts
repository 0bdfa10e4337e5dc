/**
 * Power spectrum of real frames of one size, by a complex FFT of half the size (Cooley and Tukey 1965; the real-input
 * split as in Press et al., Numerical Recipes, 12.3; both from memory). Tables are made once; nothing is allocated a frame.
 */
class PowerSpectrum {
  readonly #half: number;
  readonly #cos: Float64Array;
  readonly #sin: Float64Array;
  readonly #order: Uint32Array;
  readonly #re: Float64Array;
  readonly #im: Float64Array;
  readonly #splitCos: Float64Array;
  readonly #splitSin: Float64Array;

  /** @param size a power of two, 8 or more */
  constructor(readonly size: number) {
    if (size < 8 || (size & (size - 1)) !== 0)
      throw new RangeError('an FFT size is a power of two, 8 or more');
    const half = size / 2;
    this.#half = half;
    this.#cos = Float64Array.from({ length: half / 2 }, (_, i) => Math.cos((2 * Math.PI * i) / half));
    this.#sin = Float64Array.from({ length: half / 2 }, (_, i) => -Math.sin((2 * Math.PI * i) / half));
    this.#splitCos = Float64Array.from({ length: half + 1 }, (_, i) => Math.cos((Math.PI * i) / half));
    this.#splitSin = Float64Array.from({ length: half + 1 }, (_, i) => -Math.sin((Math.PI * i) / half));
    const bits = Math.log2(half);
    this.#order = Uint32Array.from({ length: half }, (_, i) => {
      let reversed = 0;
      for (let b = 0; b < bits; b++) reversed |= ((i >> b) & 1) << (bits - 1 - b);
      return reversed;
    });
    this.#re = new Float64Array(half);
    this.#im = new Float64Array(half);
  }

  /**
   * @param frame `size` samples, windowed by the caller; @param out `size / 2 + 1` values of |X|^2
   */
  of(frame: Float32Array | Float64Array, out: Float64Array): void {
    const half = this.#half;
    const re = this.#re;
    const im = this.#im;
    for (let i = 0; i < half; i++) {
      const to = this.#order[i] as number;
      re[to] = frame[2 * i] as number;
      im[to] = frame[2 * i + 1] as number;
    }
    this.#transform(re, im, half);
    for (let k = 0; k <= half; k++) {
      const a = k === half ? 0 : k;
      const b = k === 0 ? 0 : half - k;
      const evenRe = ((re[a] as number) + (re[b] as number)) / 2;
      const evenIm = ((im[a] as number) - (im[b] as number)) / 2;
      const oddRe = ((im[a] as number) + (im[b] as number)) / 2;
      const oddIm = ((re[b] as number) - (re[a] as number)) / 2;
      const c = this.#splitCos[k] as number;
      const s = this.#splitSin[k] as number;
      const x = evenRe + c * oddRe - s * oddIm;
      const y = evenIm + c * oddIm + s * oddRe;
      out[k] = x * x + y * y;
    }
  }

  #transform(re: Float64Array, im: Float64Array, n: number): void {
    for (let span = 1; span < n; span *= 2) {
      const step = n / (2 * span);
      for (let block = 0; block < n; block += 2 * span) {
        for (let i = 0, t = 0; i < span; i++, t += step) {
          const c = this.#cos[t] as number;
          const s = this.#sin[t] as number;
          const a = block + i;
          const b = a + span;
          const bRe = re[b] as number;
          const bIm = im[b] as number;
          const xRe = c * bRe - s * bIm;
          const xIm = c * bIm + s * bRe;
          re[b] = (re[a] as number) - xRe;
          im[b] = (im[a] as number) - xIm;
          re[a] = (re[a] as number) + xRe;
          im[a] = (im[a] as number) + xIm;
        }
      }
    }
  }
}

const made = new Map<number, PowerSpectrum>();

/** |X|^2 of a frame whose length is a power of two, 8 or more; `length / 2 + 1` values. Tables are kept between calls. */
export function powerSpectrumOf(frame: Float64Array): Float64Array {
  const spectrum = made.get(frame.length) ?? new PowerSpectrum(frame.length);
  made.set(frame.length, spectrum);
  const power = new Float64Array(frame.length / 2 + 1);
  spectrum.of(frame, power);
  return power;
}
