/** A seeded generator (mulberry32, Tommy Ettinger 2017, from memory): the same seed gives the same sound. */
export function seeded(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return ((t ^ (t >>> 14)) >>> 0) / 4_294_967_296;
  };
}

/** Gaussian noise of unit variance (Box and Muller 1958). */
export function gaussian(length: number, random: () => number): Float32Array {
  const out = new Float32Array(length);
  for (let i = 0; i < length; i += 2) {
    const radius = Math.sqrt(-2 * Math.log(Math.max(random(), 1e-12)));
    const angle = 2 * Math.PI * random();
    out[i] = radius * Math.cos(angle);
    if (i + 1 < length) out[i + 1] = radius * Math.sin(angle);
  }
  return out;
}

/** One-pole low- or high-pass in place, run twice: gentle slopes are what a chest does. */
export function onePole(
  samples: Float32Array,
  kind: 'low' | 'high',
  cutoffHz: number,
  sampleRateHz: number,
): Float32Array {
  const a = Math.exp((-2 * Math.PI * cutoffHz) / sampleRateHz);
  for (let pass = 0; pass < 2; pass++) {
    let low = 0;
    for (let i = 0; i < samples.length; i++) {
      const x = samples[i] as number;
      low = (1 - a) * x + a * low;
      samples[i] = kind === 'low' ? low : x - low;
    }
  }
  return samples;
}

/** Scale so that the RMS is `rms`. */
export function withRms(samples: Float32Array, rms: number): Float32Array {
  let squares = 0;
  for (const x of samples) squares += x * x;
  const scale = squares > 0 ? rms / Math.sqrt(squares / samples.length) : 0;
  for (let i = 0; i < samples.length; i++) samples[i] = (samples[i] as number) * scale;
  return samples;
}
