import { CLEAN, type Recipe } from './chest';
import { seeded } from './noise';

export const RECIPE_NAMES = [
  'clean vesicular',
  'clean bronchial',
  'tone in expiration',
  'bursts late in inspiration',
  'quiet',
  'too loud',
  'flat tops',
  'hum',
  'holes',
  'rubbing on the gown',
  'clicks',
  'offset',
  'too short',
  'no contact',
] as const;
export type RecipeName = (typeof RECIPE_NAMES)[number];

/** One of the named sounds, varied by seed as patients and hands vary. */
export function recipeOf(name: RecipeName, seed: number, sampleRateHz: number, seconds = 15): Recipe {
  const random = seeded(seed ^ 0x5bd1e995);
  const between = (low: number, high: number) => low + (high - low) * random();
  const base: Recipe = {
    ...CLEAN,
    seconds,
    sampleRateHz,
    breath: {
      perMinute: between(12, 22),
      kind: name === 'clean bronchial' ? 'bronchial' : 'vesicular',
      level: between(0.07, 0.1),
    },
    heart: { perMinute: between(58, 96), level: between(0.06, 0.12) },
    noise: between(0.0005, 0.0008),
  };
  const at = () => between(1, seconds - 2);
  switch (name) {
    case 'tone in expiration':
      return {
        ...base,
        tones: Array.from({ length: 3 }, (_, i) => ({
          atSeconds: 2 + i * 3.6 + between(0, 0.4),
          durationSeconds: between(0.28, 0.6),
          frequencyHz: between(380, 460),
          amplitude: 0.07,
        })),
      };
    case 'bursts late in inspiration':
      return {
        ...base,
        bursts: Array.from({ length: 14 }, () => ({
          atSeconds: at(),
          initialDeflectionMs: 0.7,
          twoCycleMs: 5,
          amplitude: between(0.1, 0.2),
        })),
      };
    case 'quiet':
      return { ...base, gain: 0.012, noise: 0.0002 };
    case 'too loud':
      return { ...base, faults: { clipGain: between(5, 9) } };
    case 'flat tops':
      return { ...base, faults: { clipGain: 3, flatTop: 0.5 } };
    case 'hum':
      return {
        ...base,
        faults: {
          hum: { frequencyHz: 50 + between(-0.2, 0.2), amplitude: between(0.02, 0.05), harmonics: 3 },
        },
      };
    case 'holes':
      return {
        ...base,
        faults: {
          dropouts: Array.from({ length: 4 }, () => ({
            atSeconds: at(),
            seconds: between(0.03, 0.12),
            kind: 'zero' as const,
          })),
        },
      };
    case 'rubbing on the gown':
      return {
        ...base,
        faults: {
          handling: Array.from({ length: 7 }, () => ({
            atSeconds: at(),
            seconds: between(0.15, 0.5),
            amplitude: 0.3,
          })),
        },
      };
    case 'clicks':
      return { ...base, faults: { spikes: 9 } };
    case 'offset':
      return { ...base, faults: { dc: 0.04 } };
    case 'too short':
      return { ...base, seconds: between(2, 4) };
    case 'no contact':
      return { ...base, breath: null, heart: null, noise: 0.00004 };
    default:
      return base;
  }
}

/** A name as often as it happens on a ward: four of five are clean. */
export function usualRecipe(random: () => number): RecipeName {
  const at = random();
  if (at < 0.62) return random() < 0.8 ? 'clean vesicular' : 'clean bronchial';
  if (at < 0.74) return 'tone in expiration';
  if (at < 0.8) return 'bursts late in inspiration';
  const faulty: RecipeName[] = [
    'too loud',
    'too loud',
    'hum',
    'holes',
    'rubbing on the gown',
    'too short',
    'quiet',
    'flat tops',
    'clicks',
    'offset',
    'no contact',
  ];
  return faulty[Math.floor(random() * faulty.length)] ?? 'too loud';
}
