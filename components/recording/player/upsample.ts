/** Half the length of the interpolation kernel, in input samples: images lie 80 dB down. */
const HALF_WIDTH = 24;
const KAISER_BETA = 8;

/** Modified Bessel function of order 0, for the Kaiser window. */
function bessel0(x: number): number {
  let sum = 1;
  let term = 1;
  for (let k = 1; term > sum * 1e-12; k++) {
    term *= (x / (2 * k)) ** 2;
    sum += term;
  }
  return sum;
}

/**
 * The same sound at a whole multiple of its rate (Kaiser-windowed sinc). Browsers refuse buffers below 8 kHz, and
 * what they do to slow ones themselves leaves audible images above the sound.
 */
export function upsample(samples: Float32Array, factor: number): Float32Array<ArrayBuffer> {
  const out = new Float32Array(samples.length * factor);
  const taps = HALF_WIDTH * 2;
  for (let phase = 0; phase < factor; phase++) {
    const kernel = kernelAt(phase / factor);
    for (let i = 0; i < samples.length; i++) {
      const first = i - HALF_WIDTH + 1;
      const start = Math.max(0, -first);
      const end = Math.min(taps, samples.length - first);
      let sum = 0;
      for (let k = start; k < end; k++) sum += (samples[first + k] as number) * (kernel[k] as number);
      out[i * factor + phase] = sum;
    }
  }
  return out;
}

/** Kernel for a point `share` of a sample after sample HALF_WIDTH - 1. */
function kernelAt(share: number): Float64Array {
  const kernel = new Float64Array(HALF_WIDTH * 2);
  let total = 0;
  for (let k = 0; k < kernel.length; k++) {
    const x = k - (HALF_WIDTH - 1) - share;
    const sinc = x === 0 ? 1 : Math.sin(Math.PI * x) / (Math.PI * x);
    const edge = Math.min(1, Math.abs(x / HALF_WIDTH));
    const value = sinc * (bessel0(KAISER_BETA * Math.sqrt(1 - edge * edge)) / bessel0(KAISER_BETA));
    kernel[k] = value;
    total += value;
  }
  // Unity at 0 Hz for every phase: no ripple on a steady level.
  for (let k = 0; k < kernel.length; k++) kernel[k] = (kernel[k] as number) / total;
  return kernel;
}

/** By what a rate is multiplied so that browsers take it: 1 from 16 kHz on, else up to 24 kHz or so. */
export const factorFor = (sampleRateHz: number): number =>
  sampleRateHz >= 16_000 ? 1 : Math.ceil(24_000 / sampleRateHz);
