import type { Kernels } from '../kernels/types';
import { type ColumnLayout, type Columns, FLOOR_DB, STEP_DB } from '../spectral/columns';
import type { Spectrogram } from '../types';

const MOST_COLUMNS = 4096;
/** "BKSG", version 1: our own layout, little-endian. */
const MAGIC = 0x4753_4b42;
const HEADER_BYTES = 56;

/** How far below the lighter of two shades, by their difference, the shade of their mean power lies. */
const BELOW_LIGHTER = Uint8Array.from({ length: 256 }, (_, apart) =>
  Math.round((-10 * Math.log10((1 + 10 ** ((-apart * STEP_DB) / 10)) / 2)) / STEP_DB),
);
const meanShade = (a: number, b: number): number =>
  a > b ? a - (BELOW_LIGHTER[a - b] as number) : b - (BELOW_LIGHTER[b - a] as number);

interface Half {
  shades: Uint8Array;
  waits: boolean;
}

/**
 * Spectrogram of one channel as bytes of half a decibel; 0 dB is a full-scale sine. A clip too long for the bound has
 * neighbouring columns averaged in power, two and two, as often as need be.
 */
export class SpectrogramPicture {
  readonly #shades: Uint8Array;
  #columns = 0;
  /** Columns of the spectrum in one of the picture: a power of two. */
  #merged = 1;
  /** Averages that wait for their other half: of one column, of two, of four ... */
  readonly #halves: Half[] = [];

  constructor(
    kernels: Kernels,
    private readonly layout: ColumnLayout,
  ) {
    this.#shades = kernels.arena.bytes(MOST_COLUMNS * layout.bins);
  }

  push({ shades, columns }: Columns): void {
    const { bins } = this.layout;
    for (let at = 0; at < columns; ) {
      if (this.#merged === 1) {
        const taken = Math.min(columns - at, MOST_COLUMNS - this.#columns);
        this.#shades.set(shades.subarray(at * bins, (at + taken) * bins), this.#columns * bins);
        this.#columns += taken;
        at += taken;
      } else this.#gather(shades, at++ * bins);
      if (this.#columns === MOST_COLUMNS) this.#merge();
    }
  }

  /** Pairs of columns become one, pairs of pairs one, until a column of the picture is whole. */
  #gather(shades: Uint8Array, from: number): void {
    const { bins } = this.layout;
    let whole = shades;
    let at = from;
    for (let level = 0; 2 ** level < this.#merged; level++) {
      const half = this.#halfOf(level);
      if (!half.waits) {
        for (let k = 0; k < bins; k++) half.shades[k] = whole[at + k] as number;
        half.waits = true;
        return;
      }
      half.waits = false;
      for (let k = 0; k < bins; k++)
        half.shades[k] = meanShade(half.shades[k] as number, whole[at + k] as number);
      whole = half.shades;
      at = 0;
    }
    this.#shades.set(whole, this.#columns * bins);
    this.#columns++;
  }

  #halfOf(level: number): Half {
    const half = this.#halves[level] ?? { shades: new Uint8Array(this.layout.bins), waits: false };
    this.#halves[level] = half;
    return half;
  }

  #merge(): void {
    const { bins } = this.layout;
    const shades = this.#shades;
    for (let c = 0; c < MOST_COLUMNS / 2; c++) {
      for (let to = c * bins, from = 2 * c * bins; to < (c + 1) * bins; to++, from++)
        shades[to] = meanShade(shades[from] as number, shades[from + bins] as number);
    }
    this.#columns /= 2;
    this.#merged *= 2;
  }

  finish(): Spectrogram {
    // What waits at the end stands for the rest of its column.
    const rest = this.#halves.findLast((half) => half.waits);
    if (rest && this.#columns < MOST_COLUMNS) {
      this.#shades.set(rest.shades, this.#columns * this.layout.bins);
      this.#columns++;
    }
    const { bins, size, hop, rateHz, binHz } = this.layout;
    const columnSeconds = (hop * this.#merged) / rateHz;
    return {
      columns: this.#columns,
      bins,
      firstColumnSeconds: size / 2 / rateHz + (columnSeconds - hop / rateHz) / 2,
      columnSeconds,
      binHz,
      floorDb: FLOOR_DB,
      stepDb: STEP_DB,
      data: this.#shades.slice(0, this.#columns * bins),
    };
  }
}

/** Header, then the columns. */
export function encodeSpectrogram(picture: Spectrogram): Uint8Array {
  const bytes = new Uint8Array(HEADER_BYTES + picture.data.length);
  const view = new DataView(bytes.buffer);
  view.setUint32(0, MAGIC, true);
  view.setUint16(4, 1, true);
  view.setUint32(8, picture.columns, true);
  view.setUint32(12, picture.bins, true);
  [picture.firstColumnSeconds, picture.columnSeconds, picture.binHz, picture.floorDb, picture.stepDb].forEach(
    (value, i) => {
      view.setFloat64(16 + 8 * i, value, true);
    },
  );
  bytes.set(picture.data, HEADER_BYTES);
  return bytes;
}

/** @throws RangeError when the bytes are not an encoded spectrogram */
export function decodeSpectrogram(bytes: Uint8Array): Spectrogram {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  if (bytes.byteLength < HEADER_BYTES || view.getUint32(0, true) !== MAGIC || view.getUint16(4, true) !== 1)
    throw new RangeError('not a spectrogram');
  const columns = view.getUint32(8, true);
  const bins = view.getUint32(12, true);
  if (HEADER_BYTES + columns * bins !== bytes.byteLength) throw new RangeError('the spectrogram is cut');
  const value = (i: number) => view.getFloat64(16 + 8 * i, true);
  return {
    columns,
    bins,
    firstColumnSeconds: value(0),
    columnSeconds: value(1),
    binHz: value(2),
    floorDb: value(3),
    stepDb: value(4),
    data: bytes.slice(HEADER_BYTES),
  };
}
