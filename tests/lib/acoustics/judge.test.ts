import { describe, expect, test } from 'vitest';
import { analyseRecording } from '@/lib/acoustics/analyse';
import { DEFAULT_LIMITS, judge, verdictOf } from '@/lib/acoustics/judge';
import { findingSentence } from '@/lib/acoustics/sentences';
import type { FindingCode, JudgingLimits } from '@/lib/acoustics/types';
import {
  add,
  breaths,
  chest,
  clip,
  cutOut,
  heartSounds,
  noise,
  offset,
  type Signal,
  scale,
  silence,
  sine,
  thump,
  wav,
} from '@/tests/support/signals';

const RATES = [4000, 8000, 44_100];
const limits = (changed: Partial<JudgingLimits> = {}): JudgingLimits => ({ ...DEFAULT_LIMITS, ...changed });
const heard = (sound: Signal | Signal[], rateHz: number, bitDepth: 8 | 16 | 24 | 32 = 16, own = limits()) =>
  analyseRecording([wav(sound, rateHz, bitDepth)], { limits: own });
const weighty = (found: { code: string; severity: string }[]) =>
  found.filter(({ severity }) => severity !== 'note').map(({ code }) => code);

describe('clean chests raise nothing', () => {
  for (const rate of RATES)
    for (const bits of [16, 24] as const)
      test(`breath and heart at ${rate} Hz and ${bits} bit`, async () => {
        const found = await heard(chest(15, rate, rate), rate, bits);
        expect(weighty(found.findings)).toEqual([]);
        expect(found.verdict).toBe('usable');
        expect(found.measures?.cleanStretch).toEqual({ from: 0, to: 15 });
      });

  test('a heart between which there is nothing at all', async () => {
    const found = await heard(heartSounds({ perMinute: 72, level: 0.3, seconds: 12 }, 4000), 4000);
    expect(weighty(found.findings)).toEqual([]);
  });

  test('breath that dies away into nothing', async () => {
    const sound = breaths({ perMinute: 15, level: 0.1, seconds: 12, seed: 3 }, 4000);
    expect(weighty((await heard(sound, 4000)).findings)).toEqual([]);
  });

  test('a slow heart that the breath makes louder and softer', async () => {
    const heart = heartSounds({ perMinute: 50, level: 0.3, seconds: 20 }, 4000);
    const swaying = heart.map((x, i) => x * (1 + 0.3 * Math.sin((2 * Math.PI * i) / 16_000)));
    expect(weighty((await heard(add(swaying, noise(0.0005, 20, 4000, 1)), 4000)).findings)).toEqual([]);
  });
});

describe.each(RATES)('faults at %i Hz', (rate) => {
  const base = () => chest(15, rate, 5);
  const one = async (sound: Signal, code: FindingCode) =>
    (await heard(sound, rate)).findings.find((finding) => finding.code === code);

  test('tops at the rail are clipped, by their share of samples', async () => {
    const sound = clip(scale(base(), 8), -1, 1);
    const share = sound.filter((x) => Math.abs(x) >= 32_766 / 32_768).length / sound.length;
    const found = await one(sound, 'clipped');
    expect(found?.severity).toBe('repeat');
    expect(found?.value).toBeCloseTo(share, 4);
  });

  test('tops below the rail are flat, at their level', async () => {
    const found = await one(scale(clip(scale(base(), 8), -1, 1), 0.5), 'flat-topped');
    expect(found?.severity).toBe('care');
    expect(found?.value).toBeCloseTo(-6.02, 1);
  });

  test.each(['zero', 'held'] as const)('a hole that is %s is as long as it is', async (kind) => {
    const sound = cutOut(base(), { atSeconds: 1, seconds: 0.1, kind }, rate);
    const found = await one(sound, 'dropout');
    expect(found?.severity).toBe('care');
    expect(found?.value).toBeCloseTo(0.1, 2);
    expect(found?.from).toBeCloseTo(1, 2);
  });

  test('holes of more than a fifth of a second are for recording again', async () => {
    expect(
      (await one(cutOut(base(), { atSeconds: 1, seconds: 0.25, kind: 'zero' }, rate), 'dropout'))?.severity,
    ).toBe('repeat');
  });

  test.each([50, 60])('hum of %i Hz', async (hz) => {
    const found = await heard(add(base(), sine(hz, 0.05, 15, rate)), rate);
    expect(found.measures?.hum?.frequencyHz).toBeCloseTo(hz, 1);
    expect(weighty(found.findings)).toContain('hum');
  });

  test.each([
    [0.03, 'care'],
    [-0.2, 'repeat'],
  ])('an offset of %d', async (dc, severity) => {
    const found = await one(offset(base(), dc), 'dc-offset');
    expect(found?.severity).toBe(severity);
    expect(found?.value).toBeCloseTo(dc, 3);
  });

  test('a quiet clip is low and not silent', async () => {
    const found = await heard(scale(base(), 0.008), rate);
    expect(weighty(found.findings)).toContain('level-low');
    expect(weighty(found.findings)).not.toContain('silent');
  });

  test('steady noise is noisy', async () => {
    expect((await one(noise(0.05, 12, rate, 2), 'noisy'))?.severity).toBe('care');
  });

  test('clicks of one and of two samples are counted', async () => {
    const sound = base();
    for (const at of [2.9, 5.5, 9.9]) sound[Math.round(at * rate)] = 0.9;
    sound.fill(-0.9, Math.round(12.1 * rate), Math.round(12.1 * rate) + 2);
    const found = await one(sound, 'spikes');
    expect(found?.value).toBe(4);
    expect(found?.from).toBeCloseTo(2.9, 3);
  });

  test('knocks on the chestpiece are handling', async () => {
    const knocks = [1.3, 4.1, 6.7, 9.2, 12.4].map((atSeconds, seed) =>
      thump({ atSeconds, durationSeconds: 0.3, amplitude: 0.7, seed }, 15, rate),
    );
    const found = await one(add(base(), ...knocks), 'handling');
    expect(found?.severity).toBe('care');
    expect(found?.from).toBeCloseTo(1.3, 1);
  });
});

describe('the whole clip', () => {
  test('zeros, and the last code of the converter, are silence and nothing else of the sound', async () => {
    const last = silence(10, 4000).map((_, i) => ((i * 7919) % 3 === 0 ? 1 : 0) / 32_768);
    for (const sound of [silence(10, 4000), last])
      expect(weighty((await heard(sound, 4000)).findings)).toEqual(['silent']);
  });

  test('a loud tone of three codes is not silence, nor noise', async () => {
    expect(weighty((await heard(sine(1000, 0.3, 6, 4000), 4000)).findings)).toEqual([]);
  });

  test('four seconds are too short; seven are too short for a rate', async () => {
    const codes = async (seconds: number) =>
      (await heard(chest(seconds, 4000), 4000)).findings
        .filter(({ code }) => code.startsWith('too-short'))
        .map(({ code, severity }) => `${code} ${severity}`);
    expect(await codes(4)).toContain('too-short repeat');
    expect(await codes(7)).toEqual(['too-short-for-rates note']);
  });

  test('half a file is cut short, and for recording again when too little is left', async () => {
    const bytes = wav(chest(12, 4000), 4000);
    const of = async (share: number) =>
      (
        await analyseRecording([bytes.subarray(0, Math.round(bytes.length * share))], { limits: limits() })
      ).findings.find(({ code }) => code === 'truncated');
    expect(await of(0.5)).toMatchObject({ severity: 'care', unit: 's' });
    expect((await of(0.5))?.value).toBeCloseTo(6, 1);
    expect((await of(0.25))?.severity).toBe('repeat');
  });

  test('a rate that the model does not have', async () => {
    const { findings, verdict } = await heard(
      chest(12, 8000),
      8000,
      16,
      limits({ expectedSampleRatesHz: [4000] }),
    );
    expect(findings).toContainEqual(
      expect.objectContaining({ code: 'rate-unexpected', severity: 'repeat', value: 8000, threshold: 4000 }),
    );
    expect(verdict).toBe('repeat');
  });

  test('what is no sound is unreadable, a header alone is empty, and neither says more', async () => {
    const noSound = await analyseRecording([new TextEncoder().encode('x'.repeat(500))], { limits: limits() });
    expect(noSound.findings).toEqual([{ code: 'unreadable', severity: 'repeat' }]);
    const empty = await analyseRecording([wav(silence(0, 4000), 4000)], { limits: limits() });
    expect(empty.findings).toEqual([{ code: 'empty', severity: 'repeat' }]);
    expect(empty.verdict).toBe('repeat');
  });

  test('equal channels are noted, an empty one is named, and a hole in the softer one is found', async () => {
    const left = chest(12, 4000);
    const codes = async (right: Signal) => (await heard([left, right], 4000)).findings;
    expect(await codes(left.slice())).toContainEqual({ code: 'channels-identical', severity: 'note' });
    expect(await codes(silence(12, 4000))).toContainEqual(
      expect.objectContaining({ code: 'channel-dead', channel: 1 }),
    );
    const torn = cutOut(scale(left, 0.5), { atSeconds: 1, seconds: 0.1, kind: 'zero' }, 4000);
    expect(await codes(torn)).toContainEqual(expect.objectContaining({ code: 'dropout', channel: 1 }));
  });
});

test('what is stored is judged again by another policy', async () => {
  const { measures, facts, findings } = await heard(offset(chest(12, 4000), 0.03), 4000);
  const stored = JSON.parse(JSON.stringify({ measures, facts }));
  expect(judge(stored.measures, stored.facts, limits())).toEqual(findings);
  expect(verdictOf(judge(stored.measures, stored.facts, limits({ dcRepeatFraction: 0.02 })))).toBe('repeat');
  expect(verdictOf(judge(stored.measures, stored.facts, limits({ dcCareFraction: 0.05 })))).toBe('usable');
});

test('clipping has words for people, with its share and what to do', () => {
  const sentence = findingSentence({ code: 'clipped', severity: 'repeat', value: 0.031 });
  expect(`${sentence.meaning} ${sentence.action}`).toBe(
    'The sound is cut off at the top for 3.1 % of the clip. Turn the gain down one step and record again.',
  );
  expect(JSON.stringify(sentence)).not.toContain('!');
});
