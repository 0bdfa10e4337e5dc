import { FloatList } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';
import type { ColumnLayout } from './columns';

/** Most columns that a push brings are turned at once. */
interface Band {
  from: number;
  to: number;
  sums: Float32Array;
}

/**
 * Mean square of frequency bands in each column of the spectrum, in units of full scale squared: twice the sum of
 * |X|^2 over the band, over the size and the sum of the squared window (Parseval; Hann: 3/8 of its length).
 */
export class BandLevels {
  readonly #scale: number;

  constructor(
    private readonly kernels: Kernels,
    private readonly layout: ColumnLayout,
  ) {
    this.#scale = 2 / (layout.size * layout.size * 0.375);
  }

  /** @param mostColumns that a push will bring */
  band(lowHz: number, highHz: number, mostColumns: number): Band {
    const { binHz, bins } = this.layout;
    // A bin reaches half a bin to both sides: the edges of the outermost are nearest to those of the band.
    const from = Math.min(bins - 1, Math.max(1, Math.round(lowHz / binHz + 0.5)));
    return {
      from,
      to: Math.min(bins, Math.max(from + 1, Math.round(highHz / binHz + 0.5))),
      sums: this.kernels.arena.floats(mostColumns),
    };
  }

  /** @returns mean squares, a column each; written over by the next call for the same band */
  of(band: Band, power: Float32Array, columns: number): Float32Array {
    this.kernels.bandSums(power, columns, this.layout.bins, band.from, band.to, band.sums);
    for (let i = 0; i < columns; i++) band.sums[i] = (band.sums[i] as number) * this.#scale;
    return band.sums.subarray(0, columns);
  }
}

/** Mean squares brought to a lower rate: the mean of all columns whose middle falls into each interval. */
export class Means {
  readonly values = new FloatList();
  #sum = 0;
  #n = 0;
  #interval = 0;
  #column = 0;

  constructor(
    private readonly layout: Pick<ColumnLayout, 'columnSeconds' | 'windowSeconds'>,
    private readonly intervalSeconds: number,
  ) {}

  push(meanSquares: Float32Array): void {
    const { columnSeconds, windowSeconds } = this.layout;
    for (let i = 0; i < meanSquares.length; i++) {
      const middle = this.#column++ * columnSeconds + windowSeconds / 2;
      const interval = Math.floor(middle / this.intervalSeconds);
      if (interval !== this.#interval && this.#n > 0) this.#close();
      this.#interval = interval;
      this.#sum += meanSquares[i] as number;
      this.#n++;
    }
  }

  #close(): void {
    this.values.push(this.#sum / this.#n);
    this.#sum = 0;
    this.#n = 0;
  }
}
