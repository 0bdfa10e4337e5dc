import type { Kernels } from '../kernels/types';
import type { Rate } from '../types';

const LEAST_CONFIDENCE = 0.5;
const LEAST_PERIODS = 2.5;
/** The earliest maximum this near to the best is taken, or sub-multiples of the rate would win. */
const NEAR_BEST = 0.85;

/**
 * Rate of a periodic envelope by its autocorrelation (Schrumpf et al. 2016, doi 10.1515/cdbme-2016-0054; Charlton et
 * al. 2017). Silent when unsure: below a peak of 0.5, or with fewer than 2.5 periods in the clip.
 *
 * @param envelope at `rateHz`; @param perMinute slowest and fastest rate looked for
 */
export function rateOf(
  kernels: Kernels,
  envelope: Float32Array,
  rateHz: number,
  perMinute: { slowest: number; fastest: number },
): Rate | null {
  const shortest = Math.max(2, Math.floor((60 / perMinute.fastest) * rateHz));
  const longest = Math.min(Math.ceil((60 / perMinute.slowest) * rateHz), Math.floor(envelope.length / 2));
  const r = autocorrelation(
    kernels,
    envelope,
    shortest - 1,
    longest + 1 < envelope.length ? longest + 1 : longest,
  );
  if (!r) return null;
  const peaks: number[] = [];
  for (let i = 1; i < r.length - 1; i++)
    if ((r[i] as number) >= (r[i - 1] as number) && (r[i] as number) > (r[i + 1] as number)) peaks.push(i);
  const best = Math.max(...peaks.map((i) => r[i] as number), Number.NEGATIVE_INFINITY);
  const first = peaks.find((i) => (r[i] as number) >= NEAR_BEST * best);
  if (first === undefined || best < LEAST_CONFIDENCE) return null;
  const [a, b, c] = [r[first - 1] as number, r[first] as number, r[first + 1] as number];
  const lag = shortest - 1 + first + (a - 2 * b + c === 0 ? 0 : (0.5 * (a - c)) / (a - 2 * b + c));
  // A maximum at the very end of the range is the slope of something slower.
  if (lag > 0.97 * ((60 / perMinute.slowest) * rateHz)) return null;
  if (envelope.length < LEAST_PERIODS * lag || b < LEAST_CONFIDENCE) return null;
  return { perMinute: (60 * rateHz) / lag, confidence: Math.min(1, b) };
}

/**
 * Unbiased autocorrelation, normalised to 1 at lag 0, of a series with its mean removed.
 *
 * @returns values for lags `from` to `to`, both included; null for a series without variance
 */
export function autocorrelation(
  kernels: Kernels,
  series: Float32Array,
  from: number,
  to: number,
): Float32Array | null {
  const n = series.length;
  if (from > to || to >= n) return null;
  let mean = 0;
  for (let i = 0; i < n; i++) mean += series[i] as number;
  mean /= n;
  const centred = kernels.arena.room(n);
  let power = 0;
  for (let i = 0; i < n; i++) {
    const d = (series[i] as number) - mean;
    centred[i] = d;
    power += d * d;
  }
  if (power === 0) return null;
  const out = kernels.arena.room(to - from + 1);
  kernels.lagged(centred, from, to, out);
  for (let lag = from; lag <= to; lag++)
    out[lag - from] = ((out[lag - from] as number) / (n - lag)) * (n / power);
  return out;
}
