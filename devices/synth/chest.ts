import { addFaults, type Faults, loseSensitivity } from './faults';
import { gaussian, onePole, seeded, withRms } from './noise';

/** A continuous tone inside the breath: where it is, how high, how long. Amplitudes are of full scale. */
export interface Tone {
  atSeconds: number;
  durationSeconds: number;
  frequencyHz: number;
  /** Frequency at the end, where it glides. */
  toHz?: number;
  amplitude: number;
}
/** A short explosive event (Kiyokawa 2001, from memory): onset, initial deflection width and two-cycle duration. */
export interface Burst {
  atSeconds: number;
  initialDeflectionMs: number;
  twoCycleMs: number;
  amplitude: number;
}

export interface Recipe {
  seconds: number;
  sampleRateHz: number;
  breath: {
    perMinute: number;
    kind: 'vesicular' | 'bronchial';
    /** RMS of the noise before its envelope, of full scale. */
    level: number;
    /** Where in a breath the clip begins, 0 to 1; by the seed when it is not said. */
    startPhase?: number;
  } | null;
  heart: { perMinute: number; level: number } | null;
  tones: Tone[];
  bursts: Burst[];
  /** RMS of the instrument's own noise. */
  noise: number;
  /** Of the chest's sound; the instrument's own noise comes after it. */
  gain: number;
  faults: Faults;
}

export const CLEAN: Omit<Recipe, 'seconds' | 'sampleRateHz'> = {
  breath: { perMinute: 16, kind: 'vesicular', level: 0.09 },
  heart: { perMinute: 72, level: 0.1 },
  tones: [],
  bursts: [],
  noise: 0.0006,
  gain: 1,
  faults: {},
};

/** Stretches of one breath as phases of 0 to 1: inspiration, a short rest, expiration, a longer rest. */
export const BREATH_PHASES = {
  inspiration: { from: 0, to: 0.36 },
  expiration: { from: 0.44, to: 0.8 },
} as const;

/** Envelope at a phase of the breath. The rests are silent, so that an activity range can be told at all. */
function breathEnvelope(phase: number, kind: 'vesicular' | 'bronchial'): number {
  const { inspiration, expiration } = BREATH_PHASES;
  if (phase < inspiration.to) return Math.sin((Math.PI * phase) / inspiration.to) ** 1.4;
  if (phase < expiration.from || phase >= expiration.to) return 0;
  const part = (phase - expiration.from) / (expiration.to - expiration.from);
  return (kind === 'bronchial' ? 1 : 0.55) * Math.sin(Math.PI * part) ** 1.6;
}

/** Noise of the breath's band. The steep lower edge leaves the heart its own band, as over a lung field. */
function addBreath(out: Float32Array, recipe: Recipe, random: () => number): void {
  if (!recipe.breath) return;
  const { perMinute, kind, level } = recipe.breath;
  const rate = recipe.sampleRateHz;
  const [lowHz, highHz] = kind === 'bronchial' ? [150, 700] : [100, 350];
  const noise = gaussian(out.length, random);
  onePole(noise, 'high', lowHz, rate);
  onePole(noise, 'high', lowHz, rate);
  onePole(noise, 'low', Math.min(highHz, rate * 0.4), rate);
  withRms(noise, level);
  const period = 60 / perMinute;
  const drawn = random() * 0.3;
  const start = recipe.breath.startPhase ?? drawn;
  for (let i = 0; i < out.length; i++) {
    const phase = (i / rate / period + start) % 1;
    out[i] = (out[i] as number) + (noise[i] as number) * breathEnvelope(phase, kind);
  }
}

function addHeart(out: Float32Array, recipe: Recipe, random: () => number): void {
  if (!recipe.heart) return;
  const { perMinute, level } = recipe.heart;
  const rate = recipe.sampleRateHz;
  const thump = (at: number, hz: number, seconds: number, amplitude: number) => {
    const from = Math.round(at * rate);
    const length = Math.round(seconds * 4 * rate);
    for (let i = 0; i < length && from + i < out.length; i++) {
      const t = i / rate;
      out[from + i] =
        (out[from + i] as number) +
        amplitude * Math.sin(2 * Math.PI * hz * t) * Math.exp(-t / seconds) * Math.min(1, t / 0.008);
    }
  };
  let at = random() * 0.3;
  while (at < recipe.seconds) {
    const period = (60 / perMinute) * (1 + 0.02 * (random() - 0.5));
    thump(at, 48, 0.03, level);
    thump(at + 0.32 * Math.min(1, 60 / perMinute), 62, 0.022, level * 0.7);
    at += period;
  }
}

function addTone(out: Float32Array, tone: Tone, rate: number): void {
  const from = Math.round(tone.atSeconds * rate);
  const length = Math.round(tone.durationSeconds * rate);
  const glideHz = (tone.toHz ?? tone.frequencyHz) - tone.frequencyHz;
  let phase = 0;
  for (let i = 0; i < length && from + i < out.length; i++) {
    const part = i / length;
    phase += (2 * Math.PI * (tone.frequencyHz + glideHz * part)) / rate;
    out[from + i] =
      (out[from + i] as number) + tone.amplitude * Math.sin(phase) * Math.min(1, part * 12, (1 - part) * 12);
  }
}

/** y = sin(4 pi w^a) (1 + cos 2 pi (sqrt w - 1/2)) / 2 with w = t/2CD and a = ln(1/4) / ln(IDW/2CD). */
function addBurst(out: Float32Array, burst: Burst, rate: number): void {
  const from = Math.ceil(burst.atSeconds * rate);
  const seconds = burst.twoCycleMs / 1000;
  const power = Math.log(0.25) / Math.log(burst.initialDeflectionMs / burst.twoCycleMs);
  for (let i = from; i < out.length; i++) {
    const w = (i / rate - burst.atSeconds) / seconds;
    if (w > 1) return;
    const window = 0.5 * (1 + Math.cos(2 * Math.PI * (Math.sqrt(w) - 0.5)));
    out[i] = (out[i] as number) + burst.amplitude * Math.sin(4 * Math.PI * w ** power) * window;
  }
}

/** Above this the instrument hears little of itself; a fixed band keeps the floor alike at every sample rate. */
const OWN_NOISE_BAND_HZ = 1600;

/**
 * A chest through a stethoscope, one channel in units of full scale. Deterministic by seed.
 * Amplitudes are chosen so that a clean recipe peaks near -9 dBFS over own noise near -60 dBFS (sine-referenced).
 */
export function synthesise(recipe: Recipe, seed: number): Float32Array {
  const random = seeded(seed);
  const rate = recipe.sampleRateHz;
  const out = new Float32Array(Math.round(recipe.seconds * rate));
  addBreath(out, recipe, random);
  addHeart(out, recipe, random);
  for (const tone of recipe.tones) addTone(out, tone, rate);
  for (const burst of recipe.bursts) addBurst(out, burst, rate);
  loseSensitivity(out, recipe.faults);
  const own = gaussian(out.length, random);
  onePole(own, 'low', Math.min(OWN_NOISE_BAND_HZ, rate * 0.35), rate);
  withRms(own, recipe.noise);
  for (let i = 0; i < out.length; i++) out[i] = (out[i] as number) * recipe.gain + (own[i] as number);
  addFaults(out, recipe.faults, rate, random);
  return out;
}
