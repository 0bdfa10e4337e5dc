import { Arena } from './arena';
import { plainFilter } from './plain/filter';
import { plainLevels } from './plain/levels';
import { plainSpectrum } from './plain/spectrum';
import type { Kernels } from './types';
import { wasmKernels } from './wasm';

/** As much as the module's memory. */
const ARENA_BYTES = 8 << 20;
/** Kept for the clips to come; more are let go. */
const MOST_KEPT = 8;

const free: Record<Kernels['kind'], Kernels[]> = { wasm: [], plain: [] };

const plainKernels = (): Kernels => ({
  kind: 'plain',
  arena: new Arena(new ArrayBuffer(ARENA_BYTES), 0),
  ...plainLevels,
  ...plainFilter,
  ...plainSpectrum,
});

/**
 * Kernels for one channel of one clip, with an empty arena.
 *
 * @param kind which implementation; WebAssembly where there is any, unless said otherwise
 */
export function takeKernels(kind: Kernels['kind'] = 'wasm'): Kernels {
  const kept = free[kind].pop();
  if (kept) return kept;
  return (kind === 'wasm' ? wasmKernels() : null) ?? plainKernels();
}

/** Arrays of its arena must not be used any more. */
export function giveKernels(kernels: Kernels): void {
  kernels.arena.reset();
  const kept = free[kernels.kind];
  if (kept.length < MOST_KEPT) kept.push(kernels);
}
