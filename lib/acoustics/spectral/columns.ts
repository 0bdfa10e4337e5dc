import { planSpectrum, type SpectrumPlan } from '../kernels/plan';
import type { Kernels } from '../kernels/types';

const WINDOW_SECONDS = 0.064;
const HIGHEST_HZ = 2000;

/** How the columns of a spectrum over time lie. */
export interface ColumnLayout {
  rateHz: number;
  size: number;
  hop: number;
  bins: number;
  binHz: number;
  columnSeconds: number;
  windowSeconds: number;
  /** Of |X|^2 to a full-scale sine. */
  sineScale: number;
}

/** Shades of the spectrum: bytes of half a decibel from here on, relative to a full-scale sine. */
export const FLOOR_DB = -120;
export const STEP_DB = 0.5;
const LEAST_POWER = 1e-13;

/** Some columns of the spectrum, one after another; the arrays are written over by the next. */
export interface Columns {
  columns: number;
  /** |X|^2, `bins` values a column. */
  power: Float32Array;
  shades: Uint8Array;
}

/**
 * Spectrum over time of one channel: Hann window of about 64 ms, three quarters overlapping, 0 to 2 kHz or Nyquist.
 * Computed once; the picture, the tones and the levels of bands all read it.
 */
export class SpectrumColumns {
  readonly layout: ColumnLayout;
  readonly #plan: SpectrumPlan;
  readonly #queue: Float32Array;
  readonly #power: Float32Array;
  readonly #shades: Uint8Array;
  #queued = 0;
  #columns = 0;

  /** @param mostSamples that a push will bring */
  constructor(
    private readonly kernels: Kernels,
    rateHz: number,
    mostSamples: number,
    private readonly onColumns: (columns: Columns) => void,
  ) {
    const size = 2 ** Math.max(5, Math.round(Math.log2(rateHz * WINDOW_SECONDS)));
    const hop = size / 4;
    const bins = Math.min(size / 2, Math.floor((HIGHEST_HZ * size) / rateHz)) + 1;
    this.layout = {
      rateHz,
      size,
      hop,
      bins,
      binHz: rateHz / size,
      columnSeconds: hop / rateHz,
      windowSeconds: size / rateHz,
      // A full-scale sine on a bin has |X| = size * coherent gain (0.5) / 2.
      sineScale: 1 / (size / 4) ** 2,
    };
    this.#plan = planSpectrum(kernels.arena, size, bins);
    this.#queue = kernels.arena.floats(mostSamples + size);
    const most = (Math.ceil(mostSamples / hop) + 4) * bins;
    this.#power = kernels.arena.floats(most);
    this.#shades = kernels.arena.bytes(most);
  }

  push(samples: Float32Array): void {
    const { size, hop, bins } = this.layout;
    this.#queue.set(samples, this.#queued);
    this.#queued += samples.length;
    const columns = this.#queued < size ? 0 : Math.floor((this.#queued - size) / hop) + 1;
    if (columns === 0) return;
    this.kernels.spectra(this.#plan, this.#queue, hop, columns, this.#power);
    this.#queue.copyWithin(0, columns * hop, this.#queued);
    this.#queued -= columns * hop;
    this.#columns += columns;
    const power = this.#power.subarray(0, columns * bins);
    this.kernels.shades(power, this.layout.sineScale, LEAST_POWER, FLOOR_DB, STEP_DB, this.#shades);
    this.onColumns({ columns, power, shades: this.#shades.subarray(0, columns * bins) });
  }

  /** A clip shorter than one window still has a column: it is filled up with silence. */
  finish(): void {
    if (this.#columns > 0 || this.#queued === 0) return;
    this.push(new Float32Array(this.layout.size - this.#queued));
  }
}
