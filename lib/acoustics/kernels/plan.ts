import type { Arena } from './arena';

/** What spectra of one size need, in one arena. */
export interface SpectrumPlan {
  size: number;
  bins: number;
  window: Float32Array;
  /** Where each pair of samples goes: bit reversal. */
  order: Int32Array;
  /** cos and -sin of 2 pi k / (size / 2), k up to a quarter of the size. */
  twiddles: Float32Array;
  /** cos and -sin of 2 pi k / size, k up to half the size. */
  split: Float32Array;
  work: Float32Array;
}

interface Tables {
  window: Float32Array;
  order: Int32Array;
  twiddles: Float32Array;
  split: Float32Array;
}

const made = new Map<number, Tables>();

/**
 * Periodic Hann window (Harris 1978): coherent gain 0.5, ENBW 1.5 bins. The cosine is turned from one value to the next
 * in double precision, which is exact to 1e-12 over any length used here.
 */
export function hann(size: number): Float64Array {
  const out = new Float64Array(size);
  const c = Math.cos((2 * Math.PI) / size);
  const s = Math.sin((2 * Math.PI) / size);
  let cos = 1;
  let sin = 0;
  for (let i = 0; i < size; i++) {
    out[i] = 0.5 - 0.5 * cos;
    const turned = c * cos - s * sin;
    sin = s * cos + c * sin;
    cos = turned;
  }
  return out;
}

const pairs = (length: number, step: number): Float32Array =>
  Float32Array.from({ length: 2 * length }, (_, i) =>
    i % 2 === 0 ? Math.cos((i / 2) * step) : -Math.sin(((i - 1) / 2) * step),
  );

function tablesOf(size: number): Tables {
  const before = made.get(size);
  if (before) return before;
  const half = size / 2;
  const bits = Math.log2(half);
  const tables: Tables = {
    window: Float32Array.from(hann(size)),
    order: Int32Array.from({ length: half }, (_, i) => {
      let reversed = 0;
      for (let b = 0; b < bits; b++) reversed |= ((i >> b) & 1) << (bits - 1 - b);
      return reversed;
    }),
    twiddles: pairs(half / 2 + 1, (2 * Math.PI) / half),
    split: pairs(half + 1, Math.PI / half),
  };
  made.set(size, tables);
  return tables;
}

/**
 * @param size a power of two, 8 or more; @param bins how many of the size / 2 + 1 are asked for
 */
export function planSpectrum(arena: Arena, size: number, bins: number): SpectrumPlan {
  if (size < 8 || (size & (size - 1)) !== 0)
    throw new RangeError('the size of a spectrum is a power of two, 8 or more');
  const tables = tablesOf(size);
  const keep = (values: Float32Array): Float32Array => {
    const own = arena.room(values.length);
    own.set(values);
    return own;
  };
  const order = arena.ints(size / 2);
  order.set(tables.order);
  return {
    size,
    bins,
    window: keep(tables.window),
    order,
    twiddles: keep(tables.twiddles),
    split: keep(tables.split),
    // Vectors of four: size of them for the pairs, and one a bin.
    work: arena.room(4 * (size + bins + 4)),
  };
}
