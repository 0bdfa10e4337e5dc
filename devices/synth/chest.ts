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
  breath: { perMinute: number; kind: 'vesicular' | 'bronchial'; level: number } | null;
  heart: { perMinute: number; level: number } | null;
  tones: Tone[];
  bursts: Burst[];
  /** RMS of the instrument's own noise. */
  noise: number;
  gain: number;
  faults: Faults;
}

export interface Faults {
  /** Cut at full scale after this gain. */
  clipGain?: number;
  /** Cut at this level, below full scale. */
  flatTop?: number;
  hum?: { frequencyHz: number; amplitude: number; harmonics?: number };
  dc?: number;
  dropouts?: { atSeconds: number; seconds: number; kind: 'zero' | 'held' }[];
  handling?: { atSeconds: number; seconds: number; amplitude: number }[];
  spikes?: number;
  silence?: boolean;
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

/** Envelope of one breath at phase 0 to 1: inspiration, a short rest, expiration, a longer rest. */
function breathEnvelope(phase: number, kind: 'vesicular' | 'bronchial'): number {
  const out = kind === 'bronchial' ? 1 : 0.55;
  if (phase < 0.36) return Math.sin((Math.PI * phase) / 0.36) ** 1.4;
  if (phase < 0.44) return 0;
  if (phase < 0.8) return out * Math.sin((Math.PI * (phase - 0.44)) / 0.36) ** 1.6;
  return 0;
}

function addBreath(out: Float32Array, recipe: Recipe, random: () => number): void {
  if (!recipe.breath) return;
  const { perMinute, kind, level } = recipe.breath;
  const rate = recipe.sampleRateHz;
  const noise = gaussian(out.length, random);
  onePole(noise, 'high', kind === 'bronchial' ? 150 : 90, rate);
  onePole(noise, 'low', Math.min(kind === 'bronchial' ? 700 : 350, rate * 0.4), rate);
  withRms(noise, level);
  const period = 60 / perMinute;
  const start = random() * 0.3;
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
      if (from + i < 0) continue;
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

function addEvents(out: Float32Array, { tones, bursts, sampleRateHz: rate }: Recipe): void {
  for (const tone of tones) {
    const from = Math.round(tone.atSeconds * rate);
    const length = Math.round(tone.durationSeconds * rate);
    let phase = 0;
    for (let i = 0; i < length && from + i < out.length; i++) {
      const part = i / length;
      phase +=
        (2 * Math.PI * (tone.frequencyHz + ((tone.toHz ?? tone.frequencyHz) - tone.frequencyHz) * part)) /
        rate;
      out[from + i] =
        (out[from + i] as number) +
        tone.amplitude * Math.sin(phase) * Math.min(1, part * 12, (1 - part) * 12);
    }
  }
  for (const burst of bursts) {
    const from = Math.round(burst.atSeconds * rate);
    const length = Math.round((burst.twoCycleMs / 1000) * rate);
    const power = Math.log(0.25) / Math.log(burst.initialDeflectionMs / burst.twoCycleMs);
    for (let i = 0; i < length && from + i < out.length; i++) {
      const w = i / length;
      const window = 0.5 * (1 + Math.cos(2 * Math.PI * (Math.sqrt(w) - 0.5)));
      out[from + i] =
        (out[from + i] as number) + burst.amplitude * Math.sin(4 * Math.PI * w ** power) * window;
    }
  }
}

function addFaults(out: Float32Array, recipe: Recipe, random: () => number): void {
  const { faults, sampleRateHz: rate } = recipe;
  if (faults.hum) {
    for (let i = 0; i < out.length; i++) {
      const angle = (2 * Math.PI * faults.hum.frequencyHz * i) / rate;
      let hum = Math.sin(angle);
      for (let h = 2; h <= (faults.hum.harmonics ?? 1); h++) hum += Math.sin(h * angle) / (2 * h);
      out[i] = (out[i] as number) + faults.hum.amplitude * hum;
    }
  }
  for (const rub of faults.handling ?? []) {
    const from = Math.round(rub.atSeconds * rate);
    const length = Math.round(rub.seconds * rate);
    const noise = onePole(gaussian(length, random), 'low', 60, rate);
    withRms(noise, rub.amplitude);
    for (let i = 0; i < length && from + i < out.length; i++)
      out[from + i] = (out[from + i] as number) + (noise[i] as number) * Math.min(1, i / (rate * 0.005));
  }
  const cut = faults.flatTop ?? 1;
  const gain = faults.clipGain ?? 1;
  for (let i = 0; i < out.length; i++)
    out[i] = Math.max(-cut, Math.min(cut, (out[i] as number) * gain + (faults.dc ?? 0)));
  for (let s = 0; s < (faults.spikes ?? 0); s++)
    out[Math.floor(random() * out.length)] = random() < 0.5 ? 0.9 : -0.9;
  for (const hole of faults.dropouts ?? []) {
    const from = Math.round(hole.atSeconds * rate);
    const to = Math.min(out.length, from + Math.round(hole.seconds * rate));
    out.fill(hole.kind === 'zero' ? 0 : (out[Math.max(0, from - 1)] ?? 0), from, to);
  }
  if (faults.silence) out.fill(0);
}

/**
 * A chest through a stethoscope, one channel in units of full scale. Deterministic by seed.
 * Amplitudes are chosen so that a clean recipe peaks near -9 dBFS over a floor near -60 dBFS.
 */
export function synthesise(recipe: Recipe, seed: number): Float32Array {
  const random = seeded(seed);
  const out = new Float32Array(Math.round(recipe.seconds * recipe.sampleRateHz));
  addBreath(out, recipe, random);
  addHeart(out, recipe, random);
  addEvents(out, recipe);
  const own = withRms(
    onePole(gaussian(out.length, random), 'low', recipe.sampleRateHz * 0.35, recipe.sampleRateHz),
    recipe.noise,
  );
  for (let i = 0; i < out.length; i++) out[i] = (out[i] as number) * recipe.gain + (own[i] as number);
  addFaults(out, recipe, random);
  return out;
}
