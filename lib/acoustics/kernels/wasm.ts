import { Arena } from './arena';
import { MODULE_BASE64 } from './module';
import { type Kernels, SECTION_LENGTH } from './types';

/** What the module exports; pointers are byte offsets in its memory. */
interface Exports {
  memory: { buffer: ArrayBuffer };
  __heap_base: { value: number };
  stretches(x: number, count: number, length: number, out: number): void;
  energies(x: number, count: number, length: number, out: number): void;
  extremes(x: number, count: number, bucket: number, out: number): void;
  magnitudes(x: number, count: number, length: number, out: number): void;
  countBelow(x: number, n: number, limit: number): number;
  bends(x: number, n: number, first: number, run: number, out: number): number;
  spread16(codes: number, channels: number, frames: number, out: number): void;
  dots(taps: number, length: number, x: number, step: number, count: number, out: number): void;
  betweenSamples(taps: number, x: number, n: number, gate: number, out: number): void;
  cascade(sections: number, count: number, x: number, out: number, n: number): void;
  twins(sections: number, x: number, first: number, second: number, n: number): void;
  spectra(
    window: number,
    order: number,
    twiddles: number,
    split: number,
    work: number,
    x: number,
    size: number,
    hop: number,
    count: number,
    bins: number,
    out: number,
  ): void;
  shades(
    power: number,
    n: number,
    scale: number,
    least: number,
    floor: number,
    step: number,
    out: number,
  ): void;
  standouts(
    shades: number,
    rows: number,
    bins: number,
    low: number,
    high: number,
    reach: number,
    least: number,
    over: number,
    out: number,
    most: number,
  ): number;
  bandSums(power: number, rows: number, bins: number, from: number, to: number, out: number): void;
  lagged(x: number, n: number, from: number, to: number, out: number): void;
}

let compiled: WebAssembly.Module | null | undefined;

/** The module, compiled once a thread; null where the engine has no WebAssembly with SIMD. */
function moduleOf(): WebAssembly.Module | null {
  if (compiled !== undefined) return compiled;
  try {
    const bytes = Uint8Array.from(atob(MODULE_BASE64), (letter) => letter.charCodeAt(0));
    compiled = WebAssembly.validate(bytes) ? new WebAssembly.Module(bytes) : null;
  } catch {
    compiled = null;
  }
  return compiled;
}

/** Kernels with an arena of their own, in WebAssembly with SIMD; null where the engine cannot. */
export function wasmKernels(): Kernels | null {
  const module = moduleOf();
  if (!module) return null;
  const wasm = new WebAssembly.Instance(module).exports as unknown as Exports;
  return {
    kind: 'wasm',
    arena: new Arena(wasm.memory.buffer, wasm.__heap_base.value),
    stretches: (x, count, length, out) => wasm.stretches(x.byteOffset, count, length, out.byteOffset),
    energies: (x, count, length, out) => wasm.energies(x.byteOffset, count, length, out.byteOffset),
    extremes: (x, count, bucket, out) => wasm.extremes(x.byteOffset, count, bucket, out.byteOffset),
    magnitudes: (x, count, length, out) => wasm.magnitudes(x.byteOffset, count, length, out.byteOffset),
    countBelow: (x, limit) => wasm.countBelow(x.byteOffset, x.length, limit),
    bends: (x, at, n, first, run, out) => wasm.bends(x.byteOffset + 4 * at, n, first, run, out.byteOffset),
    spread16: (codes, channel, channels, frames, out) =>
      wasm.spread16(codes.byteOffset + 2 * channel, channels, frames, out.byteOffset),
    dots: (taps, x, at, step, count, out) =>
      wasm.dots(taps.byteOffset, taps.length, x.byteOffset + 4 * at, step, count, out.byteOffset),
    betweenSamples: (taps, x, at, n, gate, out) =>
      wasm.betweenSamples(taps.byteOffset, x.byteOffset + 4 * at, n, gate, out.byteOffset),
    cascade: (sections, x, out) =>
      wasm.cascade(
        sections.byteOffset,
        sections.length / SECTION_LENGTH,
        x.byteOffset,
        out.byteOffset,
        x.length,
      ),
    twins: (sections, x, first, second) =>
      wasm.twins(sections.byteOffset, x.byteOffset, first.byteOffset, second.byteOffset, x.length),
    spectra: ({ window, order, twiddles, split, work, size, bins }, x, hop, count, out) =>
      wasm.spectra(
        window.byteOffset,
        order.byteOffset,
        twiddles.byteOffset,
        split.byteOffset,
        work.byteOffset,
        x.byteOffset,
        size,
        hop,
        count,
        bins,
        out.byteOffset,
      ),
    shades: (power, scale, least, floor, step, out) =>
      wasm.shades(power.byteOffset, power.length, scale, least, floor, step, out.byteOffset),
    standouts: (shades, rows, bins, { low, high, reach, least, over }, out) =>
      wasm.standouts(
        shades.byteOffset,
        rows,
        bins,
        low,
        high,
        reach,
        least,
        over,
        out.byteOffset,
        Math.floor(out.length / 3),
      ),
    bandSums: (power, rows, bins, from, to, out) =>
      wasm.bandSums(power.byteOffset, rows, bins, from, to, out.byteOffset),
    lagged: (x, from, to, out) => wasm.lagged(x.byteOffset, x.length, from, to, out.byteOffset),
  };
}
