import type { SpectrumPlan } from '../plan';
import type { Kernels } from '../types';

type Spectrum = Pick<Kernels, 'spectra' | 'shades' | 'standouts' | 'bandSums'>;

/** The same tables in double precision, and room to work: single precision costs a conversion a step here. */
interface Doubles {
  window: Float64Array;
  twiddles: Float64Array;
  split: Float64Array;
  z: Float64Array;
}
const made = new Map<number, Doubles>();

function doublesOf({ size, window, twiddles, split }: SpectrumPlan): Doubles {
  const before = made.get(size);
  if (before) return before;
  const own = {
    window: Float64Array.from(window),
    twiddles: Float64Array.from(twiddles),
    split: Float64Array.from(split),
    z: new Float64Array(size),
  };
  made.set(size, own);
  return own;
}

/** Complex FFT in place (Cooley and Tukey 1965): z holds re and im in turn, in bit-reversed order. */
function transform(z: Float64Array, w: Float64Array, half: number): void {
  let span = 1;
  if (Math.log2(half) & 1) {
    for (let a = 0; a < 2 * half; a += 4) {
      const re = z[a + 2] as number;
      const im = z[a + 3] as number;
      z[a + 2] = (z[a] as number) - re;
      z[a + 3] = (z[a + 1] as number) - im;
      z[a] = (z[a] as number) + re;
      z[a + 1] = (z[a + 1] as number) + im;
    }
    span = 2;
  }
  for (; span < half; span *= 4) twoStages(z, w, half, span);
}

/** Two stages of radix 2 at once: half the traffic with memory. */
function twoStages(z: Float64Array, w: Float64Array, half: number, span: number): void {
  const far = half / span;
  const near = half / (2 * span);
  for (let i = 0; i < span; i++) {
    const c1 = w[i * far] as number;
    const s1 = w[i * far + 1] as number;
    const c2 = w[i * near] as number;
    const s2 = w[i * near + 1] as number;
    for (let a = 2 * i; a < 2 * half; a += 8 * span) {
      const b = a + 2 * span;
      const c = b + 2 * span;
      const d = c + 2 * span;
      const zb = z[b] as number;
      const zb1 = z[b + 1] as number;
      const zd = z[d] as number;
      const zd1 = z[d + 1] as number;
      const bRe = c1 * zb - s1 * zb1;
      const bIm = c1 * zb1 + s1 * zb;
      const dRe = c1 * zd - s1 * zd1;
      const dIm = c1 * zd1 + s1 * zd;
      const za = z[a] as number;
      const za1 = z[a + 1] as number;
      const zc = z[c] as number;
      const zc1 = z[c + 1] as number;
      const b0 = za - bRe;
      const b1 = za1 - bIm;
      const c0 = zc + dRe;
      const cc = zc1 + dIm;
      const d0 = zc - dRe;
      const d1 = zc1 - dIm;
      const cRe = c2 * c0 - s2 * cc;
      const cIm = c2 * cc + s2 * c0;
      const eRe = c2 * d0 - s2 * d1;
      const eIm = c2 * d1 + s2 * d0;
      z[a] = za + bRe + cRe;
      z[a + 1] = za1 + bIm + cIm;
      z[c] = za + bRe - cRe;
      z[c + 1] = za1 + bIm - cIm;
      // times -i
      z[b] = b0 + eIm;
      z[b + 1] = b1 - eRe;
      z[d] = b0 - eIm;
      z[d + 1] = b1 + eRe;
    }
  }
}

/** Real frames by a complex FFT of half the size (the split as in Press et al., Numerical Recipes, 12.3; from memory). */
function spectra(plan: SpectrumPlan, x: Float32Array, hop: number, count: number, out: Float32Array): void {
  const { size, bins, order } = plan;
  const { window, twiddles, split, z } = doublesOf(plan);
  const half = size / 2;
  for (let frame = 0; frame < count; frame++) {
    const from = frame * hop;
    for (let i = 0; i < half; i++) {
      const to = 2 * (order[i] as number);
      z[to] = (x[from + 2 * i] as number) * (window[2 * i] as number);
      z[to + 1] = (x[from + 2 * i + 1] as number) * (window[2 * i + 1] as number);
    }
    transform(z, twiddles, half);
    powers(z, split, half, bins, out, frame * bins);
  }
}

function powers(
  z: Float64Array,
  split: Float64Array,
  half: number,
  bins: number,
  out: Float32Array,
  at: number,
): void {
  for (let k = 0; k < bins; k++) {
    const p = k === half ? 0 : 2 * k;
    const q = k === 0 ? 0 : 2 * (half - k);
    const cos = split[2 * k] as number;
    const sin = split[2 * k + 1] as number;
    const re0 = z[p] as number;
    const im0 = z[p + 1] as number;
    const re1 = z[q] as number;
    const im1 = z[q + 1] as number;
    const oddRe = im0 + im1;
    const oddIm = re1 - re0;
    const re = re0 + re1 + cos * oddRe - sin * oddIm;
    const im = im0 - im1 + cos * oddIm + sin * oddRe;
    out[at + k] = (re * re + im * im) / 4;
  }
}

const TABLE_BITS = 12;
const OCTAVE_DB = 10 * Math.log10(2);
/** Decibels of a mantissa by its first twelve bits, from the middle of each step: 0.0006 dB at most beside it. */
const MANTISSA_DB = Float32Array.from(
  { length: 1 << TABLE_BITS },
  (_, i) => 10 * Math.log10(1 + (i + 0.5) / (1 << TABLE_BITS)),
);
const asFloat = new Float32Array(1);
const asBits = new Int32Array(asFloat.buffer);

/** 10 lg of a positive normal number in single precision. */
function inDecibels(x: number): number {
  asFloat[0] = x;
  const bits = asBits[0] as number;
  const mantissa = MANTISSA_DB[(bits >> (23 - TABLE_BITS)) & ((1 << TABLE_BITS) - 1)] as number;
  return OCTAVE_DB * ((bits >> 23) - 127) + mantissa;
}

/** Whether more than half of the values are at most `limit`; most are told before the end. */
function moreThanHalf(values: Uint8Array, from: number, to: number, limit: number): boolean {
  let spare = (to - from + 1) >> 1;
  for (let i = from; i < to; i++) if ((values[i] as number) > limit && --spare === 0) return false;
  return true;
}

const sorted = new Uint8Array(256);
/** By insertion: two dozen values, often. */
function medianOf(values: Uint8Array, from: number, to: number): number {
  let n = 0;
  for (let i = from; i < to; i++) {
    const value = values[i] as number;
    let at = n++;
    while (at > 0 && (sorted[at - 1] as number) > value) {
      sorted[at] = sorted[at - 1] as number;
      at--;
    }
    sorted[at] = value;
  }
  return sorted[n >> 1] as number;
}

export const plainSpectrum: Spectrum = {
  spectra,
  shades(power, scale, least, floor, step, out) {
    for (let i = 0; i < power.length; i++) {
      const shade = Math.round((inDecibels((power[i] as number) * scale + least) - floor) / step);
      out[i] = shade < 0 ? 0 : shade > 255 ? 255 : shade;
    }
  },
  standouts(shades, rows, bins, { low, high, reach, least, over }, out) {
    const most = Math.floor(out.length / 3);
    let found = 0;
    for (let row = 0; row < rows; row++) {
      const base = row * bins;
      for (let k = low; k <= high; k++) {
        const here = shades[base + k] as number;
        if (
          here < least ||
          here < (shades[base + k - 1] as number) ||
          here <= (shades[base + k + 1] as number)
        )
          continue;
        const from = base + Math.max(1, k - reach);
        const to = base + Math.min(bins, k + reach + 1);
        const limit = here - over;
        if (!moreThanHalf(shades, from, to, limit)) continue;
        if (found === most) return found;
        out[3 * found] = row;
        out[3 * found + 1] = k;
        out[3 * found + 2] = medianOf(shades, from, to);
        found++;
      }
    }
    return found;
  },
  bandSums(power, rows, bins, from, to, out) {
    for (let row = 0; row < rows; row++) {
      let sum = 0;
      for (let i = row * bins + from; i < row * bins + to; i++) sum += power[i] as number;
      out[row] = sum;
    }
  },
};
