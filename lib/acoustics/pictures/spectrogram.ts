import type { Kernels } from '../kernels/types';
import type { ColumnLayout } from '../spectral/columns';
import type { Spectrogram } from '../types';

const MOST_COLUMNS = 4096;
const FLOOR_DB = -120;
const STEP_DB = 0.5;
const LEAST_POWER = 1e-13;
/** "BKSG", version 1: our own layout, little-endian. */
const MAGIC = 0x4753_4b42;
const HEADER_BYTES = 56;

/**
 * Spectrogram of one channel as bytes of half a decibel; 0 dB is a full-scale sine. A clip too long for the bound has
 * neighbouring columns averaged in power.
 */
export class SpectrogramPicture {
  /** Power of the columns so far; the last one may still be gathering. */
  readonly #data: Float32Array;
  #columns = 0;
  #merged = 1;
  #inColumn = 0;

  constructor(
    private readonly kernels: Kernels,
    private readonly layout: ColumnLayout,
  ) {
    this.#data = kernels.arena.room(MOST_COLUMNS * layout.bins);
  }

  /** @param power columns of the spectrum */
  push(power: Float32Array, columns: number): void {
    const { bins } = this.layout;
    for (let at = 0; at < columns; ) {
      if (this.#merged === 1) {
        const taken = Math.min(columns - at, MOST_COLUMNS - this.#columns);
        this.#data.set(power.subarray(at * bins, (at + taken) * bins), this.#columns * bins);
        this.#columns += taken;
        at += taken;
      } else this.#gather(power.subarray(at * bins, ++at * bins));
      if (this.#columns === MOST_COLUMNS) this.#merge();
    }
  }

  #gather(column: Float32Array): void {
    const { bins } = this.layout;
    const base = this.#columns * bins;
    if (this.#inColumn === 0) this.#data.set(column, base);
    else
      for (let k = 0; k < bins; k++)
        this.#data[base + k] = (this.#data[base + k] as number) + (column[k] as number);
    if (++this.#inColumn === this.#merged) this.#settle(this.#merged);
  }

  #settle(frames: number): void {
    const { bins } = this.layout;
    const base = this.#columns * bins;
    for (let k = 0; k < bins; k++) this.#data[base + k] = (this.#data[base + k] as number) / frames;
    this.#columns++;
    this.#inColumn = 0;
  }

  #merge(): void {
    const { bins } = this.layout;
    const data = this.#data;
    for (let c = 0; c < MOST_COLUMNS / 2; c++) {
      for (let to = c * bins, from = 2 * c * bins; to < (c + 1) * bins; to++, from++)
        data[to] = ((data[from] as number) + (data[from + bins] as number)) / 2;
    }
    this.#columns /= 2;
    this.#merged *= 2;
  }

  finish(): Spectrogram {
    if (this.#inColumn > 0) this.#settle(this.#inColumn);
    const { bins, size, hop, rateHz, binHz, sineScale } = this.layout;
    const length = this.#columns * bins;
    const shades = this.kernels.arena.bytes(length);
    this.kernels.shades(this.#data.subarray(0, length), sineScale, LEAST_POWER, FLOOR_DB, STEP_DB, shades);
    const columnSeconds = (hop * this.#merged) / rateHz;
    return {
      columns: this.#columns,
      bins,
      firstColumnSeconds: size / 2 / rateHz + (columnSeconds - hop / rateHz) / 2,
      columnSeconds,
      binHz,
      floorDb: FLOOR_DB,
      stepDb: STEP_DB,
      data: shades.slice(),
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
