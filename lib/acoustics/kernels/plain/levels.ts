import type { Kernels } from '../types';

type Levels = Pick<
  Kernels,
  | 'stretches'
  | 'energies'
  | 'extremes'
  | 'magnitudes'
  | 'countBelow'
  | 'bends'
  | 'spread16'
  | 'dots'
  | 'lagged'
  | 'betweenSamples'
>;

function stretches(x: Float32Array, count: number, length: number, out: Float32Array): void {
  for (let s = 0, at = 0; s < count; s++) {
    const first = x[at] as number;
    let min = first;
    let max = first;
    let sum = 0;
    let squares = 0;
    for (const end = at + length; at < end; at++) {
      const value = x[at] as number;
      const d = value - first;
      sum += d;
      squares += d * d;
      if (value < min) min = value;
      if (value > max) max = value;
    }
    out[4 * s] = min;
    out[4 * s + 1] = max;
    out[4 * s + 2] = sum;
    out[4 * s + 3] = squares;
  }
}

function bends(
  x: Float32Array,
  from: number,
  n: number,
  first: number,
  run: number,
  out: Float32Array,
): number {
  const last = from + n;
  let runs = 0;
  let before = x[from - 1] as number;
  let here = x[from] as number;
  for (let at = from, end = from + first; at < last; end += run, runs++) {
    if (end > last) end = last;
    let sum = 0;
    let most = 0;
    for (; at < end; at++) {
      const next = x[at + 1] as number;
      const bend = Math.abs(here + here - before - next);
      sum += bend;
      if (bend > most) most = bend;
      before = here;
      here = next;
    }
    out[2 * runs] = sum;
    out[2 * runs + 1] = most;
  }
  return runs;
}

function dots(
  taps: Float32Array,
  x: Float32Array,
  from: number,
  step: number,
  count: number,
  out: Float32Array,
): void {
  const length = taps.length;
  for (let k = 0, at = from; k < count; k++, at += step) {
    // Four sums: an addition waits for the one before it.
    let a = 0;
    let b = 0;
    let c = 0;
    let d = 0;
    for (let j = 0; j < length; j += 4) {
      a += (taps[j] as number) * (x[at + j] as number);
      b += (taps[j + 1] as number) * (x[at + j + 1] as number);
      c += (taps[j + 2] as number) * (x[at + j + 2] as number);
      d += (taps[j + 3] as number) * (x[at + j + 3] as number);
    }
    out[k] = a + b + c + d;
  }
}

function lagged(x: Float32Array, from: number, to: number, out: Float32Array): void {
  const n = x.length;
  for (let lag = from; lag <= to; lag++) {
    let a = 0;
    let b = 0;
    let i = 0;
    for (; i + 1 + lag < n; i += 2) {
      a += (x[i] as number) * (x[i + lag] as number);
      b += (x[i + 1] as number) * (x[i + 1 + lag] as number);
    }
    if (i + lag < n) a += (x[i] as number) * (x[i + lag] as number);
    out[lag - from] = a + b;
  }
}

function betweenSamples(
  taps: Float32Array,
  x: Float32Array,
  from: number,
  n: number,
  gate: number,
  out: Float32Array,
): void {
  let high = out[0] as number;
  let low = out[1] as number;
  for (let i = from; i < from + n; i++) {
    const here = Math.abs(x[i] as number);
    if (here < gate || here < Math.abs(x[i - 1] as number) || here < Math.abs(x[i + 1] as number)) continue;
    for (let at = i - 6; at <= i - 5; at++) {
      for (let phase = 0; phase < 4; phase++) {
        let sum = 0;
        for (let j = 0; j < 12; j++) sum += (taps[4 * j + phase] as number) * (x[at + j] as number);
        if (sum > high) high = sum;
        if (sum < low) low = sum;
      }
    }
  }
  out[0] = high;
  out[1] = low;
}

export const plainLevels: Levels = {
  stretches,
  bends,
  dots,
  lagged,
  betweenSamples,
  energies(x, count, length, out) {
    for (let s = 0, at = 0; s < count; s++) {
      let sum = 0;
      for (const end = at + length; at < end; at++) sum += (x[at] as number) * (x[at] as number);
      out[s] = sum;
    }
  },
  extremes(x, count, bucket, out) {
    for (let b = 0, at = 0; b < count; b++) {
      let min = x[at] as number;
      let max = min;
      for (const end = at + bucket; at < end; at++) {
        const value = x[at] as number;
        if (value < min) min = value;
        if (value > max) max = value;
      }
      out[2 * b] = min;
      out[2 * b + 1] = max;
    }
  },
  magnitudes(x, count, length, out) {
    for (let s = 0, at = 0; s < count; s++) {
      let most = 0;
      for (const end = at + length; at < end; at++) {
        const value = Math.abs(x[at] as number);
        if (value > most) most = value;
      }
      out[s] = most;
    }
  },
  countBelow(x, limit) {
    // The limit arrives in single precision on the other side.
    const bound = Math.fround(limit);
    let count = 0;
    for (let i = 0; i < x.length; i++) if (Math.abs(x[i] as number) <= bound) count++;
    return count;
  },
  spread16(codes, channel, channels, frames, out) {
    for (let i = 0, k = channel; i < frames; i++, k += channels) out[i] = (codes[k] as number) / 32_768;
  },
};
