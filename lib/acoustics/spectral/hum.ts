import { powerSpectrumOf } from '../dsp/fft';
import { percentile, percentiles } from '../dsp/percentile';
import { hann } from '../kernels/plan';
import type { Hum } from '../types';

const MAINS_HZ = [50, 60] as const;
/** EN 50160: within 1 % of the nominal frequency for 99.5 % of a year in interconnected systems (read second hand). */
const SEARCH = 0.01;
const SHORTEST_SECONDS = 4;
const LEAST_PROMINENCE_DB = 15;
const LEAST_STEADINESS = 0.55;
const WINDOW_SECONDS = 0.25;
const HARMONICS = [2, 3, 5] as const;

interface Line {
  frequencyHz: number;
  steadiness: number;
  amplitude: number;
}

/**
 * Mains hum at 50 or 60 Hz, told apart from the heart.
 *
 * A window as long as the clip finds the strongest line within 1 % of the mains frequency; its prominence is against
 * the median of the bins 2 to 8 Hz away. Heart sounds make a comb of lines at the heart rate that can stand 60 dB out,
 * so a line must also stand still: demodulated in 0.25 s Hann windows, the 10th percentile of its amplitude over the
 * median is at least 0.55 (real hum 0.64 to 0.97, heart at most 0.27; measured on synthetic clips). Amplitude is twice
 * the 25th percentile, not the peak of the spectrum. Not seen: hum more than about 20 dB below loud breath, and clips
 * under 4 s. Goertzel 1958 for the demodulation's ancestor (from memory).
 *
 * @param samples the clip divided to a rate above 2 x 320 Hz
 * @param bandRms RMS of the 100-600 Hz band, full scale
 */
export function findHum(samples: Float32Array, rateHz: number, bandRms: number): Hum | null {
  if (samples.length < SHORTEST_SECONDS * rateHz) return null;
  const spectrum = longSpectrum(samples);
  const found = MAINS_HZ.map((nominal) => lineNear(samples, rateHz, spectrum, nominal))
    .filter((line): line is Line => line !== null && isHum(line))
    .sort((a, b) => b.amplitude - a.amplitude)[0];
  if (!found) return null;
  const harmonicsHz = HARMONICS.map((n) => found.frequencyHz * n)
    .filter((hz) => hz < rateHz * 0.45)
    .filter((hz) => {
      const line = lineNear(samples, rateHz, spectrum, hz);
      return line !== null && isHum(line);
    });
  return {
    frequencyHz: found.frequencyHz,
    relativeDb: bandRms > 0 ? 20 * Math.log10(found.amplitude / Math.SQRT2 / bandRms) : 0,
    amplitudeDbfs: 20 * Math.log10(found.amplitude),
    steadiness: found.steadiness,
    harmonicsHz,
  };
}

const isHum = (line: Line): boolean => line.steadiness >= LEAST_STEADINESS;

interface LongSpectrum {
  power: Float64Array;
  size: number;
}

function longSpectrum(samples: Float32Array): LongSpectrum {
  const size = 2 ** Math.ceil(Math.log2(samples.length));
  const frame = new Float64Array(size);
  let mean = 0;
  for (let i = 0; i < samples.length; i++) mean += samples[i] as number;
  mean /= samples.length;
  // Hann over the length of the clip; its cosine by turning, which is as exact as it need be.
  const turn = (2 * Math.PI) / samples.length;
  const [c, s] = [Math.cos(turn), Math.sin(turn)];
  let [cos, sin] = [1, 0];
  for (let i = 0; i < samples.length; i++) {
    frame[i] = ((samples[i] as number) - mean) * (0.5 - 0.5 * cos);
    [cos, sin] = [c * cos - s * sin, s * cos + c * sin];
  }
  return { power: powerSpectrumOf(frame), size };
}

function lineNear(
  samples: Float32Array,
  rateHz: number,
  { power, size }: LongSpectrum,
  nominalHz: number,
): Line | null {
  const binHz = rateHz / size;
  const bin = (hz: number) => Math.round(hz / binHz);
  const low = bin(nominalHz * (1 - SEARCH));
  const high = bin(nominalHz * (1 + SEARCH));
  if (high + 1 >= power.length) return null;
  let peak = low;
  for (let k = low; k <= high; k++) if ((power[k] as number) > (power[peak] as number)) peak = k;
  const below = power.subarray(bin(nominalHz - 8), bin(nominalHz - 2) + 1);
  const above = power.subarray(bin(nominalHz + 2), bin(nominalHz + 8) + 1);
  const around = new Float64Array(below.length + above.length);
  around.set(below);
  around.set(above, below.length);
  const median = percentile(around, 0.5);
  const prominenceDb = 10 * Math.log10((power[peak] as number) / Math.max(median, 1e-30));
  // Most clips have no hum: what follows costs more than all before it.
  if (prominenceDb < LEAST_PROMINENCE_DB) return null;
  // The true frequency between bins, by a parabola through the logarithms of three of them.
  const [a, b, c] = [-1, 0, 1].map((d) => Math.log(Math.max(power[peak + d] ?? 1e-30, 1e-30))) as [
    number,
    number,
    number,
  ];
  const shift = a - 2 * b + c === 0 ? 0 : (0.5 * (a - c)) / (a - 2 * b + c);
  const frequencyHz = (peak + Math.max(-0.5, Math.min(0.5, shift))) * binHz;
  const amplitudes = demodulate(samples, rateHz, frequencyHz);
  const [low10, low25, middle] = percentiles(amplitudes, [0.1, 0.25, 0.5]) as [number, number, number];
  return { frequencyHz, steadiness: middle > 0 ? low10 / middle : 0, amplitude: low25 };
}

/** Amplitude of a line in successive 0.25 s Hann windows, half overlapping. */
function demodulate(samples: Float32Array, rateHz: number, frequencyHz: number): number[] {
  const size = Math.round(WINDOW_SECONDS * rateHz);
  const step = (2 * Math.PI * frequencyHz) / rateHz;
  const window = hann(size);
  const cos = window.map((w, i) => w * Math.cos(step * i));
  const sin = window.map((w, i) => w * Math.sin(step * i));
  const amplitudes: number[] = [];
  for (let at = 0; at + size <= samples.length; at += size >> 1) {
    let re = 0;
    let im = 0;
    for (let i = 0; i < size; i++) {
      const x = samples[at + i] as number;
      re += x * (cos[i] as number);
      im += x * (sin[i] as number);
    }
    // Twice for the other half of the spectrum, and the Hann window passes one half (coherent gain 0.5).
    amplitudes.push((2 * Math.hypot(re, im)) / (0.5 * size));
  }
  return amplitudes;
}
