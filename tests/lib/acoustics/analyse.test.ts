import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { analyseRecording } from '@/lib/acoustics/analyse';
import { DEFAULT_LIMITS } from '@/lib/acoustics/judge';
import type { Measures } from '@/lib/acoustics/types';
import reference from '@/tests/reference/acoustics/levels.json' with { type: 'json' };
import {
  chest,
  clip,
  cutOut,
  inPieces,
  type Signal,
  scale,
  silence,
  sine,
  wav,
} from '@/tests/support/signals';

async function measured(sound: Signal, rateHz: number, piece = 65_536): Promise<Measures> {
  const pieces = inPieces(wav(sound, rateHz), piece);
  const { measures } = await analyseRecording(pieces, { limits: DEFAULT_LIMITS });
  if (!measures) throw new Error('no measures');
  return measures;
}

describe('levels as sox and ffmpeg read them', () => {
  test('a sine of amplitude 0.3', async () => {
    const m = await measured(sine(1000, 0.3, 6, 44_100), 44_100);
    expect(m.peakDbfs).toBeCloseTo(reference.sine.peakDbfs, 3);
    expect(m.rmsDbfsSine).toBeCloseTo(reference.sine.rmsDbfsSquare + reference.squareToSineReferenceDb, 3);
    expect(10 ** ((m.crestDb ?? 0) / 20)).toBeCloseTo(reference.sine.crestFactor, 3);
    expect(m.crestDb).toBeCloseTo(reference.sineCrestDb, 2);
  });

  test('a sine that is cut at the rail, with its share of samples there', async () => {
    const m = await measured(clip(sine(97, 1.0125, 5, 8000), -1, 1), 8000);
    expect(m.peakDbfs).toBeCloseTo(reference.cut.peakDbfs, 2);
    expect(m.rmsDbfsSine).toBeCloseTo(reference.cut.rmsDbfsSquare + reference.squareToSineReferenceDb, 3);
    expect(m.clippedFraction).toBeCloseTo(reference.cut.shareAtRail, 3);
  });

  test('a full-scale sine reads 0 dBFS and is not clipped', async () => {
    const m = await measured(sine(97, 1, 5, 8000), 8000);
    expect(m.rmsDbfsSine).toBeCloseTo(0, 2);
    expect(m.clippedSamples).toBe(0);
  });
});

test('the size of the pieces changes nothing', async () => {
  const torn = cutOut(chest(12, 4000, 9), { atSeconds: 1, seconds: 0.05, kind: 'held' }, 4000);
  for (const at of [2.9, 7.77]) torn[Math.round(at * 4000)] = 0.9;
  const whole = await measured(torn, 4000);
  expect(whole.dropouts).toHaveLength(1);
  expect(whole.spikes).toHaveLength(2);
  await fc.assert(
    fc.asyncProperty(fc.integer({ min: 1, max: 9001 }), async (piece) => {
      expect(await measured(torn, 4000, piece)).toEqual(whole);
    }),
    { numRuns: 8, seed: 1 },
  );
});

test('gain moves every level by its decibels and no place', async () => {
  const sound = scale(chest(12, 8000, 4), 0.5);
  const plain = await measured(sound, 8000);
  await fc.assert(
    fc.asyncProperty(fc.double({ min: 0.2, max: 1.5, noNaN: true }), async (gain) => {
      const louder = await measured(scale(sound, gain), 8000);
      const db = 20 * Math.log10(gain);
      for (const level of ['peakDbfs', 'rmsDbfsSine', 'activeLevelDbfsSine'] as const)
        expect((louder[level] ?? 0) - (plain[level] ?? 0)).toBeCloseTo(db, 1);
      expect(louder.activityRangeDb).toBeCloseTo(plain.activityRangeDb ?? 0, 0);
    }),
    { numRuns: 5, seed: 1 },
  );
});

test('what comes later is found later by as much', async () => {
  const sound = cutOut(chest(12, 4000, 2), { atSeconds: 1, seconds: 0.1, kind: 'zero' }, 4000);
  const later = new Float32Array([...chest(2, 4000, 8), ...sound]);
  const [first] = (await measured(sound, 4000)).dropouts;
  const [shifted] = (await measured(later, 4000)).dropouts;
  expect((shifted?.startSeconds ?? 0) - (first?.startSeconds ?? 0)).toBeCloseTo(2, 6);
});

test('turning the sound upside down turns the offset and nothing else', async () => {
  const sound = clip(scale(chest(12, 4000, 6), 6), -0.999, 0.999);
  const [up, down] = [await measured(sound, 4000), await measured(scale(sound, -1), 4000)];
  expect(down.dcFraction).toBeCloseTo(-up.dcFraction, 6);
  expect(down.rmsDbfsSine).toBeCloseTo(up.rmsDbfsSine ?? 0, 6);
  expect(down.activityRangeDb).toBeCloseTo(up.activityRangeDb ?? 0, 3);
  expect(down.flatTop?.side).toBe('both');
});

test('silence has no level, and not minus infinity', async () => {
  const m = await measured(silence(6, 4000), 4000);
  expect([m.peakDbfs, m.rmsDbfsSine, m.activeLevelDbfsSine, m.crestDb]).toEqual([null, null, null, null]);
});
