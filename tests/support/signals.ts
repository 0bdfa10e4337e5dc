import { gaussian, seeded, withRms } from '@/devices/synth/noise';
import { encodeWav } from '@/devices/synth/wav';

/**
 * Signals that tests are made of, in units of full scale. What they contain is known by construction; they are made
 * otherwise than the chest of `devices/synth`, so that the measures are not tuned to one generator.
 */
export type Signal = Float32Array<ArrayBuffer>;

export const silence = (seconds: number, rateHz: number): Signal =>
  new Float32Array(Math.round(seconds * rateHz));

export function sine(
  frequencyHz: number,
  amplitude: number,
  seconds: number,
  rateHz: number,
  phase = 0,
): Signal {
  return silence(seconds, rateHz).map(
    (_, i) => amplitude * Math.sin((2 * Math.PI * frequencyHz * i) / rateHz + phase),
  );
}

export function noise(rms: number, seconds: number, rateHz: number, seed: number): Signal {
  const length = Math.round(seconds * rateHz);
  return withRms(gaussian(length, seeded(seed)), rms).map((x) => x);
}

/** Noise of one band: complex one-pole resonators would ring, so it is a sum of many random sines, flat in the band. */
function bandNoise(
  fromHz: number,
  toHz: number,
  rms: number,
  seconds: number,
  rateHz: number,
  seed: number,
): Signal {
  const random = seeded(seed);
  const out = silence(seconds, rateHz);
  const lines = 400;
  for (let k = 0; k < lines; k++) {
    const step = (2 * Math.PI * (fromHz + (toHz - fromHz) * ((k + random()) / lines))) / rateHz;
    // A rotation a sample in place of a sine a sample; double precision drifts by nothing in a minute.
    const [cos, sin] = [Math.cos(step), Math.sin(step)];
    const phase = 2 * Math.PI * random();
    let [re, im] = [Math.cos(phase), Math.sin(phase)];
    for (let i = 0; i < out.length; i++) {
      out[i] = (out[i] as number) + im;
      [re, im] = [re * cos - im * sin, re * sin + im * cos];
    }
  }
  return withRms(out, rms).map((x) => x);
}

export function add(...signals: readonly Signal[]): Signal {
  const out = new Float32Array(Math.max(...signals.map((signal) => signal.length)));
  for (const signal of signals)
    for (let i = 0; i < signal.length; i++) out[i] = (out[i] as number) + (signal[i] as number);
  return out;
}

export const scale = (signal: Signal, factor: number): Signal => signal.map((x) => x * factor);
export const offset = (signal: Signal, dc: number): Signal => signal.map((x) => x + dc);
export const clip = (signal: Signal, low: number, high: number): Signal =>
  signal.map((x) => Math.max(low, Math.min(high, x)));

/** Breath sounds: noise of 100 to 1000 Hz, inspiration and a weaker expiration with pauses between. */
export function breaths(
  options: { perMinute: number; level: number; seconds: number; seed: number },
  rateHz: number,
): Signal {
  const { perMinute, level, seconds, seed } = options;
  const period = 60 / perMinute;
  const sound = bandNoise(100, Math.min(1000, rateHz * 0.45), level, seconds, rateHz, seed);
  return sound.map((x, i) => {
    const phase = (i / rateHz / period) % 1;
    const inspiration = phase < 0.4 ? Math.sin((Math.PI * phase) / 0.4) : 0;
    const expiration = phase > 0.48 && phase < 0.85 ? 0.5 * Math.sin((Math.PI * (phase - 0.48)) / 0.37) : 0;
    return x * (inspiration + expiration);
  });
}

/** First and second heart sounds: bursts of 45 and 60 Hz with a Gaussian envelope. */
export function heartSounds(
  options: { perMinute: number; level: number; seconds: number },
  rateHz: number,
): Signal {
  const { perMinute, level, seconds } = options;
  const period = 60 / perMinute;
  const burst = (t: number, at: number, hz: number, width: number, amplitude: number) =>
    amplitude * Math.exp(-0.5 * ((t - at) / width) ** 2) * Math.sin(2 * Math.PI * hz * (t - at));
  return silence(seconds, rateHz).map((_, i) => {
    const t = (i / rateHz) % period;
    return (
      burst(t, 0.1, 45, 0.025, level) + burst(t, 0.1 + 0.3 * Math.min(1, period), 60, 0.018, 0.7 * level)
    );
  });
}

const chests = new Map<string, Signal>();

/** A clean recording: breath and heart over the instrument's own noise near -66 dBFS. Made once, handed out as copies. */
export function chest(seconds: number, rateHz: number, seed = 1): Signal {
  const name = `${seconds} ${rateHz} ${seed}`;
  const made = chests.get(name) ?? makeChest(seconds, rateHz, seed);
  chests.set(name, made);
  return made.slice();
}

function makeChest(seconds: number, rateHz: number, seed: number): Signal {
  return add(
    breaths({ perMinute: 15, level: 0.08, seconds, seed }, rateHz),
    heartSounds({ perMinute: 72, level: 0.12, seconds }, rateHz),
    noise(0.0005, seconds, rateHz, seed + 1000),
  );
}

/** Replace a stretch by zeros, or by the sample that stood before it. */
export function cutOut(
  signal: Signal,
  hole: { atSeconds: number; seconds: number; kind: 'zero' | 'held' },
  rateHz: number,
): Signal {
  const out = signal.slice();
  const from = Math.round(hole.atSeconds * rateHz);
  out.fill(hole.kind === 'zero' ? 0 : (out[from - 1] ?? 0), from, from + Math.round(hole.seconds * rateHz));
  return out;
}

/** Contact noise: a thump of low frequency with a broad crack at its start. */
export function thump(
  options: { atSeconds: number; durationSeconds: number; amplitude: number; seed: number },
  seconds: number,
  rateHz: number,
): Signal {
  const out = silence(seconds, rateHz);
  const from = Math.round(options.atSeconds * rateHz);
  const length = Math.round(options.durationSeconds * rateHz);
  const crack = noise(1, options.durationSeconds, rateHz, options.seed);
  for (let i = 0; i < length && from + i < out.length; i++) {
    const t = i / rateHz;
    const fade = 1 - i / length;
    out[from + i] =
      options.amplitude *
      fade *
      (Math.sin(2 * Math.PI * 18 * t) + 0.35 * (crack[i] as number) * Math.exp(-t / 0.03));
  }
  return out;
}

/** A WAV file of what is given, by default 16 bit. */
export const wav = (
  channels: Signal | readonly Signal[],
  rateHz: number,
  bitDepth: 8 | 16 | 24 | 32 = 16,
): Uint8Array =>
  encodeWav(channels instanceof Float32Array ? [channels] : channels, { sampleRateHz: rateHz, bitDepth });

/** A stream of pieces, as storage hands them out. */
export function* inPieces(bytes: Uint8Array, size: number): Generator<Uint8Array> {
  for (let at = 0; at < bytes.length; at += size) yield bytes.subarray(at, at + size);
}
