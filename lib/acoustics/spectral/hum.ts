import { percentile, percentiles } from '../dsp/percentile';
import { hann } from '../kernels/plan';
import type { Kernels } from '../kernels/types';
import type { Hum } from '../types';
import { zoomSpectrum } from './zoom';

const MAINS_HZ = [50, 60] as const;
/** EN 50160: within 1 % of the nominal frequency for 99.5 % of a year in interconnected systems (read second hand). */
const SEARCH = 0.01;
const SHORTEST_SECONDS = 4;
/** What stands still need not stand out so far: beside a loud heart, hum that breath covers is 11 dB out and 0.7 steady. */
const LEAST_PROMINENCE_DB = 11;
const LEAST_STEADINESS = 0.55;
/** A line so far above every other within reach is no tooth of a comb, however the sound around it comes and goes. */
const ALONE = { aboveOthersDb: 10, prominenceDb: 20, fromHz: 0.75 };
const WINDOW_SECONDS = 0.25;
/** What a line is held against lies this far from it. */
const NEIGHBOURS_HZ = { from: 2, to: 8 };
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
 * the 25th percentile, not the peak of the spectrum. Where the heart drowns a weaker hum at every beat, a line that stands
 * 10 dB above every other within 8 Hz is hum too, as a heart's lines come in rows; its amplitude is that of the spectrum. Not seen: hum more than about 20 dB below loud breath, and clips
 * under 4 s. Goertzel 1958 for the demodulation's ancestor (from memory).
 *
 * @param samples the clip divided to a rate above 2 x 320 Hz, in the kernels' arena
 * @param bandRms RMS of the 100-600 Hz band, full scale
 */
export function findHum(
  kernels: Kernels,
  samples: Float32Array,
  rateHz: number,
  bandRms: number,
): Hum | null {
  if (samples.length < SHORTEST_SECONDS * rateHz) return null;
  const lineAt = (hz: number) => lineNear(kernels, samples, rateHz, hz);
  const found = MAINS_HZ.map(lineAt)
    .filter((line): line is Line => line !== null)
    .sort((a, b) => b.amplitude - a.amplitude)[0];
  if (!found) return null;
  const harmonicsHz = HARMONICS.map((n) => found.frequencyHz * n)
    .filter((hz) => hz < rateHz * 0.45)
    .filter((hz) => lineAt(hz) !== null);
  return {
    frequencyHz: found.frequencyHz,
    relativeDb: bandRms > 0 ? 20 * Math.log10(found.amplitude / Math.SQRT2 / bandRms) : 0,
    amplitudeDbfs: 20 * Math.log10(found.amplitude),
    steadiness: found.steadiness,
    harmonicsHz,
  };
}

/** The line within 1 % of a frequency, where one stands out and stands still. */
function lineNear(kernels: Kernels, samples: Float32Array, rateHz: number, nominalHz: number): Line | null {
  const zoom = zoomSpectrum(kernels, samples, rateHz, nominalHz);
  if (!zoom) return null;
  const { power, binHz } = zoom;
  const at = (offset: number) => power[(offset + power.length) % power.length] as number;
  const bins = (hz: number) => Math.round(hz / binHz);
  const reach = Math.max(1, bins(SEARCH * nominalHz));
  let peak = 0;
  for (let k = -reach; k <= reach; k++) if (at(k) > at(peak)) peak = k;
  const around: number[] = [];
  for (let k = bins(NEIGHBOURS_HZ.from); k <= bins(NEIGHBOURS_HZ.to); k++) around.push(at(k), at(-k));
  const prominenceDb = 10 * Math.log10(at(peak) / Math.max(percentile(around, 0.5), 1e-30));
  // Most clips have no hum: what follows costs more than all before it.
  if (!(prominenceDb >= LEAST_PROMINENCE_DB)) return null;
  // The true frequency between bins, by a parabola through the logarithms of three of them.
  const log = (offset: number) => Math.log(Math.max(at(offset), 1e-30));
  const [a, b, c] = [log(peak - 1), log(peak), log(peak + 1)];
  const shift = a - 2 * b + c === 0 ? 0 : (0.5 * (a - c)) / (a - 2 * b + c);
  const frequencyHz = nominalHz + (peak + Math.max(-0.5, Math.min(0.5, shift))) * binHz;
  const amplitudes = demodulate(samples, rateHz, frequencyHz);
  const [low10, low25, middle] = percentiles(amplitudes, [0.1, 0.25, 0.5]) as [number, number, number];
  const steadiness = middle > 0 ? low10 / middle : 0;
  const alone = prominenceDb >= ALONE.prominenceDb && isAlone(at, peak, bins);
  if (alone) return { frequencyHz, steadiness, amplitude: Math.sqrt(at(peak)) };
  return steadiness >= LEAST_STEADINESS ? { frequencyHz, steadiness, amplitude: low25 } : null;
}

/** Whether no other line within reach comes near: heart sounds have one every 0.7 to 3 Hz, each about as strong. */
function isAlone(at: (offset: number) => number, peak: number, bins: (hz: number) => number): boolean {
  let other = 0;
  for (let k = bins(ALONE.fromHz); k <= bins(NEIGHBOURS_HZ.to); k++)
    other = Math.max(other, at(peak + k), at(peak - k));
  return at(peak) >= other * 10 ** (ALONE.aboveOthersDb / 10);
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
