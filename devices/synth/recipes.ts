import { BREATH_PHASES, CLEAN, type Recipe } from './chest';
import type { Faults } from './faults';
import { seeded } from './noise';

type Between = (low: number, high: number) => number;
/** What a name adds to a clean chest. */
type Season = (clean: Sitting, between: Between) => Partial<Recipe>;

/** A clean recipe whose breath is known, so that events can be put where in the breath they belong. */
interface Sitting extends Recipe {
  breath: NonNullable<Recipe['breath']> & { startPhase: number };
  heart: NonNullable<Recipe['heart']>;
}

const withFaults =
  (make: (clean: Sitting, between: Between) => Faults): Season =>
  (clean, between) => ({ faults: make(clean, between) });

/** Seconds at which each breath of the clip reaches a phase; a clip too short for one has none. */
function timesOf(clean: Sitting, phase: number, keepSeconds: number): number[] {
  const period = 60 / clean.breath.perMinute;
  const first = (((phase - clean.breath.startPhase) % 1) + 1) % 1;
  const times: number[] = [];
  for (let at = first * period; at + keepSeconds <= clean.seconds; at += period) times.push(at);
  return times;
}

/** Tones that begin early in expiration. */
const tones =
  (glide: number): Season =>
  (clean, between) => ({
    tones: timesOf(clean, BREATH_PHASES.expiration.from + 0.06, 0.7).map((atSeconds) => {
      const frequencyHz = between(380, 460);
      return {
        atSeconds,
        durationSeconds: between(0.28, 0.6),
        frequencyHz,
        ...(glide === 1 ? {} : { toHz: frequencyHz * glide }),
        amplitude: 0.07,
      };
    }),
  });

/** Explosive events in the last third of inspiration. */
const bursts =
  (widths: { initialDeflectionMs: number; twoCycleMs: number }): Season =>
  (clean, between) => ({
    bursts: timesOf(clean, 0.25, 0.5).flatMap((from) =>
      Array.from({ length: 4 }, (_, i) => ({
        atSeconds: from + ((i + between(0.1, 0.9)) * (0.09 * 60)) / clean.breath.perMinute / 4,
        ...widths,
        amplitude: between(0.15, 0.3),
      })),
    ),
  });

const somewhere = (clean: Sitting, between: Between) => between(0.1, 0.85) * clean.seconds;
const hum = (mainsHz: number): Season =>
  withFaults((_, between) => ({
    hum: { frequencyHz: mainsHz + between(-0.2, 0.2), amplitude: between(0.02, 0.05), harmonics: 3 },
  }));
const holes = (kind: 'zero' | 'held'): Season =>
  withFaults((clean, between) => ({
    dropouts: Array.from({ length: 4 }, () => ({
      atSeconds: somewhere(clean, between),
      seconds: between(0.06, 0.12),
      kind,
    })),
  }));
const rubbing = withFaults((clean, between) => ({
  handling: Array.from({ length: 7 }, () => ({
    atSeconds: somewhere(clean, between),
    seconds: between(0.15, 0.5),
    amplitude: 0.3,
  })),
}));

// Widths of fine and coarse events: published means of ATS nomenclature (0.7/5 ms and 1.5/10 ms), from memory.
const SEASONS = {
  'clean vesicular': () => ({}),
  'clean bronchial': (clean) => ({ breath: { ...clean.breath, kind: 'bronchial' } }),
  'tone in expiration': tones(1),
  'gliding tone in expiration': tones(0.75),
  'bursts late in inspiration': bursts({ initialDeflectionMs: 0.7, twoCycleMs: 5 }),
  'coarse bursts late in inspiration': bursts({ initialDeflectionMs: 1.5, twoCycleMs: 10 }),
  'heart close by': (clean) => ({
    breath: { ...clean.breath, level: 0.035 },
    heart: { ...clean.heart, level: 0.3 },
  }),
  quiet: () => ({ gain: 0.012, noise: 0.0002 }),
  noisy: () => ({ noise: 0.04 }),
  'too loud': withFaults((_, between) => ({ clipGain: between(8, 12) })),
  'a little loud': withFaults((_, between) => ({ clipGain: between(4.4, 4.8) })),
  'flat tops': withFaults(() => ({ clipGain: 3, flatTop: 0.5 })),
  hum: hum(50),
  'hum of 60 Hz': hum(60),
  holes: holes('zero'),
  'held samples': holes('held'),
  'rubbing on the gown': rubbing,
  clicks: withFaults(() => ({ spikes: 9 })),
  offset: withFaults(() => ({ dc: 0.04 })),
  'losing sensitivity': withFaults(() => ({ sensitivityDb: { from: 0, to: -15 } })),
  'wrong rate in the header': withFaults((clean) => ({ declaredRateHz: clean.sampleRateHz * 2 })),
  'too short': (_, between) => ({ seconds: between(2, 4) }),
  'no contact': () => ({ breath: null, heart: null, noise: 0.00004 }),
  silence: withFaults(() => ({ silence: true })),
} satisfies Record<string, Season>;

export type RecipeName = keyof typeof SEASONS;

/** One of the named sounds, varied by seed as patients and hands vary. */
export function recipeOf(name: RecipeName, seed: number, sampleRateHz: number, seconds = 15): Recipe {
  const random = seeded(seed ^ 0x5bd1e995);
  const between: Between = (low, high) => low + (high - low) * random();
  const clean: Sitting = {
    ...CLEAN,
    seconds,
    sampleRateHz,
    breath: {
      perMinute: between(12, 22),
      kind: 'vesicular',
      level: between(0.08, 0.11),
      startPhase: between(0, 0.3),
    },
    heart: { perMinute: between(58, 96), level: between(0.1, 0.18) },
    noise: between(0.0006, 0.0009),
  };
  const season: Season = SEASONS[name];
  return { ...clean, ...season(clean, between) };
}

/** A name as often as it happens on a ward: four of five are clean. */
export function usualRecipe(random: () => number): RecipeName {
  const at = random();
  if (at < 0.62) return random() < 0.8 ? 'clean vesicular' : 'clean bronchial';
  if (at < 0.74) return 'tone in expiration';
  if (at < 0.8) return 'bursts late in inspiration';
  const faulty: RecipeName[] = [
    'too loud',
    'a little loud',
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
