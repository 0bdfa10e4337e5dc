import { writeFileSync } from 'node:fs';
import { afterAll, expect, test } from 'vitest';
import { synthesise } from '@/devices/synth/chest';
import { recipeOf } from '@/devices/synth/recipes';
import { encodeWav } from '@/devices/synth/wav';
import { soundRoom } from '../support/sound';

const room = soundRoom();
afterAll(() => room.close());

test.each([
  'clean vesicular',
  'gliding tone in expiration',
  'bursts late in inspiration',
  'rubbing on the gown',
  'held samples',
  'losing sensitivity',
] as const)('%s is the same by seed and another by another', (name) => {
  const make = (seed: number) => Buffer.from(synthesise(recipeOf(name, seed, 4000, 6), seed).buffer);
  expect(make(3).equals(make(3))).toBe(true);
  expect(make(3).equals(make(4))).toBe(false);
});

test('sox reads the peak of a clean chest near -9 dBFS at every depth', () => {
  const samples = synthesise(recipeOf('clean vesicular', 1, 4000), 1);
  for (const bitDepth of [16, 24, 32, 'float32'] as const) {
    writeFileSync(room.at(`${bitDepth}.wav`), encodeWav([samples], { sampleRateHz: 4000, bitDepth }));
    const peak = Number(/^Pk lev dB\s+(\S+)/m.exec(room.stats(`${bitDepth}.wav`))?.[1]);
    expect(peak).toBeGreaterThan(-12);
    expect(peak).toBeLessThan(-6);
  }
});
