/**
 * Unbiased autocorrelation, normalised to 1 at lag 0, of a series with its mean removed.
 *
 * @returns values for lags `from` to `to`, both included; null for a series without variance
 */
export function autocorrelation(series: Float32Array, from: number, to: number): Float64Array | null {
  const n = series.length;
  let mean = 0;
  for (const x of series) mean += x;
  mean /= n;
  const centred = Float64Array.from(series, (x) => x - mean);
  let power = 0;
  for (const x of centred) power += x * x;
  if (power === 0 || from > to || to >= n) return null;
  power /= n;
  const out = new Float64Array(to - from + 1);
  for (let lag = from; lag <= to; lag++) {
    let sum = 0;
    for (let i = 0; i + lag < n; i++) sum += (centred[i] as number) * (centred[i + lag] as number);
    out[lag - from] = sum / (n - lag) / power;
  }
  return out;
}
