import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { compileKernels, compilerVersion } from '@/lib/acoustics/kernels/build.mjs';
import { takeKernels } from '@/lib/acoustics/kernels/kernels';
import { COMPILER, MODULE_BASE64 } from '@/lib/acoustics/kernels/module';
import { hann, planSpectrum } from '@/lib/acoustics/kernels/plan';
import type { Kernels } from '@/lib/acoustics/kernels/types';
import { wasmKernels } from '@/lib/acoustics/kernels/wasm';

const wasm = wasmKernels();
if (!wasm) throw new Error('this engine has no WebAssembly with SIMD');

/** The same work by both implementations, each on arrays of its own arena. */
function both<Result>(work: (kernels: Kernels) => Result): [Result, Result] {
  return ([wasm as Kernels, takeKernels('plain')] as const).map((kernels) => {
    kernels.arena.reset();
    return work(kernels);
  }) as [Result, Result];
}

const inArena = (kernels: Kernels, values: ArrayLike<number>): Float32Array => {
  const own = kernels.arena.floats(values.length);
  own.set(values);
  return own;
};

const sound = fc
  .array(fc.float({ min: -1, max: 1, noNaN: true }), { minLength: 80, maxLength: 400 })
  .map((values) => Float32Array.from(values));

function close(a: ArrayLike<number>, b: ArrayLike<number>, within: number): void {
  expect(a.length).toBe(b.length);
  for (let i = 0; i < a.length; i++)
    expect(Math.abs((a[i] as number) - (b[i] as number))).toBeLessThanOrEqual(
      within * Math.max(1, Math.abs(b[i] as number)),
    );
}

const agree = (work: (kernels: Kernels, x: Float32Array) => ArrayLike<number>, within: number) =>
  fc.assert(
    fc.property(sound, (values) => {
      const [a, b] = both((kernels) => Array.from(work(kernels, inArena(kernels, values))));
      close(a, b, within);
    }),
    { numRuns: 60 },
  );

describe('both implementations agree', () => {
  test('on extremes, sums and squares of stretches', () =>
    agree((k, x) => {
      const out = k.arena.floats(4 * 5);
      k.stretches(x, 5, Math.floor(x.length / 5), out);
      return out;
    }, 1e-5));

  test('on energies, extremes and magnitudes', () =>
    agree((k, x) => {
      const [energies, extremes, magnitudes] = [k.arena.floats(3), k.arena.floats(4), k.arena.floats(3)];
      k.energies(x, 3, Math.floor(x.length / 3), energies);
      k.extremes(x, 2, 40, extremes);
      k.magnitudes(x, 3, Math.floor(x.length / 3), magnitudes);
      return [...energies, ...extremes, ...magnitudes, k.countBelow(x, 0.25)];
    }, 1e-5));

  test('on bends, wherever the first run ends', () =>
    agree((k, x) => {
      const out = k.arena.floats(40);
      return [k.bends(x, 1, x.length - 2, 5, 16, out), ...out.subarray(0, 8)];
    }, 1e-5));

  test('on filters of any length and step', () =>
    agree((k, x) => {
      const taps = inArena(
        k,
        Array.from({ length: 28 }, (_, i) => Math.sin(i)),
      );
      const out = k.arena.floats(10);
      k.dots(taps, x, 1, 5, 10, out);
      return out;
    }, 1e-5));

  test('on cascades and twin cascades, state included', () =>
    agree((k, x) => {
      const section = [0.2, 0.3, 0.1, -0.9, 0.4, 0, 0];
      const other = [0.5, -0.5, 0, -0.7, 0.1, 0, 0];
      const two = k.arena.doubles(14);
      two.set([...section, ...other]);
      const three = k.arena.doubles(21);
      three.set([...section, ...other, ...section]);
      const twins = k.arena.doubles(42);
      for (let i = 0; i < 21; i++) {
        twins[2 * i] = three[i] as number;
        twins[2 * i + 1] = [...other, ...section, ...other][i] as number;
      }
      const outs = Array.from({ length: 4 }, () => k.arena.floats(x.length)) as [
        Float32Array,
        Float32Array,
        Float32Array,
        Float32Array,
      ];
      k.cascade(two, x, outs[0]);
      k.cascade(three, x, outs[1]);
      k.twins(twins, x, outs[2], outs[3]);
      return [...outs.flatMap((out) => [...out]), ...two, ...three, ...twins];
    }, 1e-6));

  test('on sound between samples', () =>
    agree((k, x) => {
      const taps = inArena(
        k,
        Array.from({ length: 48 }, (_, i) => Math.cos(i) / 6),
      );
      const out = inArena(k, [-10, 10, 0, 0]);
      k.betweenSamples(taps, x, 8, x.length - 16, 0.4, out);
      return out.subarray(0, 2);
    }, 1e-5));

  test('on 16-bit codes of one channel and of three', () =>
    agree((k, x) => {
      const own = k.arena.bytes(2 * 60);
      const codes = new Int16Array(own.buffer, own.byteOffset, 60);
      codes.set(Array.from(x.subarray(0, 60), (value) => Math.round(value * 32_767)));
      const [mono, third] = [k.arena.floats(60), k.arena.floats(20)];
      k.spread16(codes, 0, 1, 60, mono);
      k.spread16(codes, 2, 3, 20, third);
      return [...mono, ...third];
    }, 0));

  test.each([8, 16, 32, 64])('on spectra of %d samples, of any number of frames', (size) =>
    agree((k, x) => {
      const bins = size / 2 + 1;
      const out = k.arena.floats(5 * bins);
      k.spectra(planSpectrum(k.arena, size, bins), x, 3, 5, out);
      return out;
    }, 2e-5),
  );

  test('on shades within one, and on what stands out of the same shades', () => {
    fc.assert(
      fc.property(sound, (values) => {
        const [a, b] = both((k) => {
          const power = inArena(
            k,
            Array.from(values, (x) => x * x + 1e-9),
          );
          const shades = k.arena.bytes(values.length + 32).fill(0);
          k.shades(power, 1, 1e-12, -120, 0.5, shades);
          return Array.from(shades.subarray(0, values.length));
        });
        a.forEach((shade, i) => {
          expect(Math.abs(shade - (b[i] as number))).toBeLessThanOrEqual(1);
        });
        const search = { low: 2, high: 36, reach: 9, least: 40, over: 12 };
        const [c, d] = both((k) => {
          const shades = k.arena.bytes(80 + 32);
          shades.set(a.slice(0, 80));
          const out = k.arena.ints(300);
          const count = k.standouts(shades, 2, 40, search, out);
          return Array.from(out.subarray(0, 3 * count));
        });
        expect(c).toEqual(d);
      }),
      { numRuns: 200 },
    );
  });

  test('on sums over bands and on lagged products', () =>
    agree((k, x) => {
      const [sums, lags] = [k.arena.floats(2), k.arena.floats(21)];
      k.bandSums(x, 2, 40, 3, 31, sums);
      k.lagged(x, 10, 30, lags);
      return [...sums, ...lags];
    }, 1e-4));
});

test('a cosine in the fifth of 64 bins has |X| = 32, and nothing else where it does not leak', () => {
  // Textbook: N/2; here under a Hann window, which passes half and leaves a quarter in the bins beside (Harris 1978).
  for (const kernels of [wasm, takeKernels('plain')]) {
    kernels.arena.reset();
    const x = inArena(
      kernels,
      Array.from({ length: 64 }, (_, i) => Math.cos((2 * Math.PI * 5 * i) / 64)),
    );
    const out = kernels.arena.floats(33);
    kernels.spectra(planSpectrum(kernels.arena, 64, 33), x, 64, 1, out);
    const magnitudes = Array.from(out, Math.sqrt);
    expect(magnitudes[5]).toBeCloseTo(32 / 2, 4);
    expect(magnitudes[4]).toBeCloseTo(32 / 4, 4);
    expect(magnitudes[6]).toBeCloseTo(32 / 4, 4);
    expect(Math.max(...magnitudes.slice(8))).toBeLessThan(1e-4);
  }
});

test('the Hann window has the figures of the handbook', () => {
  // Harris 1978: coherent gain 0.5, equivalent noise bandwidth 1.5 bins, scalloping 1.4236 dB, first side lobe -31.47 dB;
  // overlap correlation 0.1667 at one half, 0.6592 at three quarters.
  const size = 4096;
  const w = hann(size);
  const sum = w.reduce((a, b) => a + b, 0);
  const squares = w.reduce((a, b) => a + b * b, 0);
  expect(sum / size).toBeCloseTo(0.5, 9);
  expect((size * squares) / sum ** 2).toBeCloseTo(1.5, 9);
  const at = (bin: number) => {
    let [re, im] = [0, 0];
    w.forEach((value, i) => {
      re += value * Math.cos((2 * Math.PI * bin * i) / size);
      im += value * Math.sin((2 * Math.PI * bin * i) / size);
    });
    return 20 * Math.log10(Math.hypot(re, im) / sum);
  };
  expect(at(0.5)).toBeCloseTo(-1.4236, 3);
  const lobe = Math.max(...Array.from({ length: 100 }, (_, i) => at(2 + i / 100)));
  expect(lobe).toBeCloseTo(-31.47, 1);
  const overlap = (share: number) => {
    const shift = size * (1 - share);
    let common = 0;
    for (let i = 0; i + shift < size; i++) common += (w[i] as number) * (w[i + shift] as number);
    return common / squares;
  };
  expect(overlap(0.5)).toBeCloseTo(0.1667, 3);
  expect(overlap(0.75)).toBeCloseTo(0.6592, 3);
});

test('the compiled module is what its sources give, where the compiler is the one it was made with', () => {
  // Without that compiler the agreement above is what speaks for the module.
  const here = compilerVersion();
  if (here !== COMPILER) {
    expect(WebAssembly.validate(Buffer.from(MODULE_BASE64, 'base64'))).toBe(true);
    return;
  }
  expect(compileKernels().toString('base64')).toBe(MODULE_BASE64);
});

test('an arena that is full says so', () => {
  const { arena } = takeKernels('plain');
  arena.reset();
  expect(() => arena.floats(4 << 20)).toThrow(RangeError);
});
