import { hann, PowerSpectrum } from '../dsp/fft';
import type { Spectrogram } from '../types';

const WINDOW_SECONDS = 0.064;
const MOST_COLUMNS = 4096;
const HIGHEST_HZ = 2000;
const FLOOR_DB = -120;
const STEP_DB = 0.5;
/** "BKSG", version 1: our own layout, little-endian. */
const MAGIC = 0x4753_4b42;
const HEADER_BYTES = 56;

/**
 * Spectrogram of one channel as bytes of half a decibel: Hann window of about 64 ms, three quarters overlapping, 0 to
 * 2 kHz or Nyquist; 0 dB is a full-scale sine. A clip too long for the bound has neighbouring columns averaged in power.
 */
export class SpectrogramProbe {
  readonly #size: number;
  readonly #hop: number;
  readonly #bins: number;
  readonly #window: Float64Array;
  readonly #spectrum: PowerSpectrum;
  readonly #power: Float64Array;
  readonly #frame: Float64Array;
  readonly #scale: number;
  #queue: Float32Array;
  #queued = 0;
  #data: Float32Array;
  #columns = 0;
  #merged = 1;
  #inColumn = 0;

  /** @param onColumn is given each column's power before any merging, with its scale to a full-scale sine */
  constructor(
    private readonly rateHz: number,
    private readonly onColumn?: (power: Float64Array, scale: number) => void,
  ) {
    this.#size = 2 ** Math.max(5, Math.round(Math.log2(rateHz * WINDOW_SECONDS)));
    this.#hop = this.#size / 4;
    this.#bins = Math.min(this.#size / 2, Math.floor((HIGHEST_HZ * this.#size) / rateHz)) + 1;
    this.#window = hann(this.#size);
    this.#spectrum = new PowerSpectrum(this.#size);
    this.#power = new Float64Array(this.#size / 2 + 1);
    this.#frame = new Float64Array(this.#size);
    // A full-scale sine on a bin has |X| = size * coherent gain (0.5) / 2.
    this.#scale = 1 / (this.#size / 4) ** 2;
    this.#queue = new Float32Array(this.#size * 2);
    this.#data = new Float32Array(256 * this.#bins);
  }

  /** How its columns lie: what a listener on them needs. */
  get layout() {
    return {
      binHz: this.rateHz / this.#size,
      bins: this.#bins,
      columnSeconds: this.#hop / this.rateHz,
      windowSeconds: this.#size / this.rateHz,
    };
  }

  push(samples: Float32Array): void {
    if (this.#queue.length < this.#queued + samples.length) {
      const grown = new Float32Array(this.#queued + samples.length + this.#size);
      grown.set(this.#queue.subarray(0, this.#queued));
      this.#queue = grown;
    }
    this.#queue.set(samples, this.#queued);
    this.#queued += samples.length;
    let at = 0;
    for (; at + this.#size <= this.#queued; at += this.#hop) this.#column(at);
    this.#queue.copyWithin(0, at, this.#queued);
    this.#queued -= at;
  }

  #column(at: number): void {
    for (let i = 0; i < this.#size; i++)
      this.#frame[i] = (this.#queue[at + i] as number) * (this.#window[i] as number);
    this.#spectrum.of(this.#frame, this.#power);
    this.onColumn?.(this.#power, this.#scale);
    if (this.#inColumn === 0 && (this.#columns + 1) * this.#bins > this.#data.length) {
      const grown = new Float32Array(Math.min(this.#data.length * 2, MOST_COLUMNS * this.#bins));
      grown.set(this.#data);
      this.#data = grown;
    }
    const base = this.#columns * this.#bins;
    for (let k = 0; k < this.#bins; k++) {
      const power = (this.#power[k] as number) * this.#scale;
      this.#data[base + k] = this.#inColumn === 0 ? power : (this.#data[base + k] as number) + power;
    }
    if (++this.#inColumn < this.#merged) return;
    this.#settle(base, this.#inColumn);
    if (this.#columns === MOST_COLUMNS) this.#merge();
  }

  #settle(base: number, frames: number): void {
    for (let k = 0; k < this.#bins; k++) this.#data[base + k] = (this.#data[base + k] as number) / frames;
    this.#columns++;
    this.#inColumn = 0;
  }

  #merge(): void {
    const bins = this.#bins;
    for (let c = 0; c < MOST_COLUMNS / 2; c++) {
      for (let k = 0; k < bins; k++)
        this.#data[c * bins + k] =
          ((this.#data[2 * c * bins + k] as number) + (this.#data[(2 * c + 1) * bins + k] as number)) / 2;
    }
    this.#columns /= 2;
    this.#merged *= 2;
  }

  finish(): Spectrogram {
    // A clip shorter than one window still has a picture: it is filled up with silence.
    if (this.#columns === 0 && this.#inColumn === 0 && this.#queued > 0)
      this.push(new Float32Array(this.#size - this.#queued));
    if (this.#inColumn > 0) this.#settle(this.#columns * this.#bins, this.#inColumn);
    const data = new Uint8Array(this.#columns * this.#bins);
    for (let i = 0; i < data.length; i++) {
      const db = 10 * Math.log10((this.#data[i] as number) + 1e-13);
      data[i] = Math.max(0, Math.min(255, Math.round((db - FLOOR_DB) / STEP_DB)));
    }
    const columnSeconds = (this.#hop * this.#merged) / this.rateHz;
    return {
      columns: this.#columns,
      bins: this.#bins,
      firstColumnSeconds: this.#size / 2 / this.rateHz + (columnSeconds - this.#hop / this.rateHz) / 2,
      columnSeconds,
      binHz: this.rateHz / this.#size,
      floorDb: FLOOR_DB,
      stepDb: STEP_DB,
      data,
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
