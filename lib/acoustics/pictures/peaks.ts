import type { AudioBlock, WaveformPeaks } from '../types';

const MOST_BUCKETS = 32_768;
const FIRST_BUCKET_FRAMES = 16;
const SMALLEST_LEVEL = 256;
/** "BKPK", version 1: our own layout, little-endian. */
const MAGIC = 0x4b504b42;
const HEADER_BYTES = 28;

/** Waveform peaks as a clip goes by: the finest level is merged in pairs whenever it would grow past its bound. */
export class PeaksProbe {
  #data = new Int8Array(MOST_BUCKETS * 2);
  #buckets = 0;
  #framesPerBucket = FIRST_BUCKET_FRAMES;
  #min = Number.POSITIVE_INFINITY;
  #max = Number.NEGATIVE_INFINITY;
  #inBucket = 0;
  #frames = 0;

  constructor(private readonly sampleRateHz: number) {}

  pushBlock(block: AudioBlock): void {
    const length = block[0]?.length ?? 0;
    let at = 0;
    while (at < length) {
      const end = Math.min(length, at + this.#framesPerBucket - this.#inBucket);
      for (const channel of block) {
        let { min, max } = { min: this.#min, max: this.#max };
        for (let i = at; i < end; i++) {
          const x = channel[i] as number;
          if (x < min) min = x;
          if (x > max) max = x;
        }
        this.#min = min;
        this.#max = max;
      }
      this.#inBucket += end - at;
      at = end;
      if (this.#inBucket === this.#framesPerBucket) this.#close();
    }
    this.#frames += length;
  }

  #close(): void {
    this.#data[this.#buckets * 2] = toByte(this.#min);
    this.#data[this.#buckets * 2 + 1] = toByte(this.#max);
    this.#buckets++;
    this.#min = Number.POSITIVE_INFINITY;
    this.#max = Number.NEGATIVE_INFINITY;
    this.#inBucket = 0;
    if (this.#buckets === MOST_BUCKETS) {
      halve(this.#data, this.#buckets, this.#data);
      this.#buckets /= 2;
      this.#framesPerBucket *= 2;
    }
  }

  finish(): WaveformPeaks {
    if (this.#inBucket > 0) this.#close();
    const levels = [this.#data.slice(0, this.#buckets * 2)];
    while ((levels.at(-1)?.length ?? 0) / 2 > SMALLEST_LEVEL) {
      const finer = levels.at(-1) as Int8Array;
      const buckets = finer.length / 2;
      const coarser = new Int8Array(Math.ceil(buckets / 2) * 2);
      halve(finer, buckets, coarser);
      levels.push(coarser);
    }
    return {
      framesPerBucket: this.#framesPerBucket,
      frames: this.#frames,
      sampleRateHz: this.sampleRateHz,
      levels,
    };
  }
}

const toByte = (x: number): number => Math.max(-127, Math.min(127, Math.round(x * 127)));

function halve(from: Int8Array, buckets: number, to: Int8Array): void {
  for (let b = 0; b < Math.ceil(buckets / 2); b++) {
    const second = 2 * b + 1 < buckets ? 2 * b + 1 : 2 * b;
    const min = Math.min(from[4 * b] as number, from[2 * second] as number);
    const max = Math.max(from[4 * b + 1] as number, from[2 * second + 1] as number);
    to[2 * b] = min;
    to[2 * b + 1] = max;
  }
}

/** Header (magic, version, levels, frames, rate, frames a bucket), length of each level, then the levels. */
export function encodePeaks(peaks: WaveformPeaks): Uint8Array {
  const body = peaks.levels.reduce((sum, level) => sum + level.length, 0);
  const bytes = new Uint8Array(HEADER_BYTES + 4 * peaks.levels.length + body);
  const view = new DataView(bytes.buffer);
  view.setUint32(0, MAGIC, true);
  view.setUint16(4, 1, true);
  view.setUint16(6, peaks.levels.length, true);
  view.setFloat64(8, peaks.frames, true);
  view.setFloat64(16, peaks.sampleRateHz, true);
  view.setUint32(24, peaks.framesPerBucket, true);
  let at = HEADER_BYTES;
  for (const level of peaks.levels) {
    view.setUint32(at, level.length, true);
    at += 4;
  }
  for (const level of peaks.levels) {
    bytes.set(new Uint8Array(level.buffer, level.byteOffset, level.length), at);
    at += level.length;
  }
  return bytes;
}

/** @throws RangeError when the bytes are not encoded peaks */
export function decodePeaks(bytes: Uint8Array): WaveformPeaks {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  if (bytes.byteLength < HEADER_BYTES || view.getUint32(0, true) !== MAGIC || view.getUint16(4, true) !== 1)
    throw new RangeError('not waveform peaks');
  const count = view.getUint16(6, true);
  let at = HEADER_BYTES + 4 * count;
  const levels = Array.from({ length: count }, (_, i) => {
    const length = view.getUint32(HEADER_BYTES + 4 * i, true);
    if (at + length > bytes.byteLength) throw new RangeError('waveform peaks are cut');
    const level = new Int8Array(bytes.slice(at, at + length).buffer);
    at += length;
    return level;
  });
  return {
    frames: view.getFloat64(8, true),
    sampleRateHz: view.getFloat64(16, true),
    framesPerBucket: view.getUint32(24, true),
    levels,
  };
}
