import { expect, test } from 'vitest';
import { factorFor, upsample } from '@/components/recording/player/upsample';
import { columnsOf } from '@/components/recording/stage/drawWaveform';
import { fitView, lanesOf, ticksOf, viewWith, zoomAbout } from '@/components/recording/stage/view';
import { takeKernels } from '@/lib/acoustics/kernels/kernels';
import { PeaksProbe } from '@/lib/acoustics/pictures/peaks';

test('zooming keeps the point under the pointer where it is', () => {
  const view = zoomAbout({ from: 2, to: 10 }, 4, 0.5, 15);
  expect(view).toEqual({ from: 3, to: 7 });
});

test('the view never leaves the recording', () => {
  expect(fitView({ from: -3, to: 2 }, 15)).toEqual({ from: 0, to: 5 });
  expect(fitView({ from: 12, to: 20 }, 15)).toEqual({ from: 7, to: 15 });
  expect(zoomAbout({ from: 5, to: 6 }, 5.5, 1000, 15)).toEqual({ from: 0, to: 15 });
  expect(viewWith({ from: 0, to: 5 }, 7, 15)).toEqual({ from: 2, to: 7 });
});

test('the axis is marked at round values and at the very ends', () => {
  expect(ticksOf(0, 15, 8)).toEqual({ values: [0, 2, 4, 6, 8, 10, 12, 14], digits: 0 });
  const close = ticksOf(2.31, 2.34, 3);
  expect(close.digits).toBe(2);
  expect(close.values.map((value) => value.toFixed(2))).toEqual(['2.31', '2.32', '2.33', '2.34']);
});

test('labels that would cover one another go to other lanes, and without room to none', () => {
  const labels = [0, 10, 20, 60].map((left) => ({ left, width: 50 }));
  expect(lanesOf(labels, 2)).toEqual([0, 1, null, 0]);
});

test('one loud sample in ten minutes is seen however far the waveform is zoomed out', () => {
  const samples = new Float32Array(4000 * 600);
  samples[1_234_567] = -0.75;
  const probe = new PeaksProbe([takeKernels('plain')], 4000, samples.length);
  probe.pushBlock([samples]);
  const columns = columnsOf(probe.finish(), { from: 0, to: 600 }, 300);
  const at = Math.floor((1_234_567 / samples.length) * 300);
  expect(columns[at * 2]).toBeCloseTo(-0.75, 1);
  expect(columns.filter((value) => value !== 0)).toHaveLength(1);
});

test('a tone made faster for the browser is the same tone, and nothing above it', () => {
  const rate = 4000;
  const factor = factorFor(rate);
  const tone = (length: number, fs: number) =>
    Float32Array.from({ length }, (_, n) => Math.sin((2 * Math.PI * 412 * n) / fs));
  const out = upsample(tone(rate, rate), factor);
  const ideal = tone(out.length, rate * factor);
  // Away from the ends, where half of the kernel has nothing to stand on.
  let worst = 0;
  for (let n = 200 * factor; n < out.length - 200 * factor; n++)
    worst = Math.max(worst, Math.abs((out[n] as number) - (ideal[n] as number)));
  expect(worst).toBeLessThan(1e-4);
  expect(rate * factor).toBeGreaterThanOrEqual(24_000);
  expect(factorFor(44_100)).toBe(1);
});
