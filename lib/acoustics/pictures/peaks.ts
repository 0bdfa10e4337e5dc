import type { Kernels } from '../kernels/types';
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

  readonly #extremes: Float32Array[];

  /** @param kernels one a channel; @param mostFrames that a push will bring */
  constructor(
    private readonly kernels: readonly Kernels[],
    private readonly sampleRateHz: number,
    mostFrames: number,
  ) {
    const most = 2 * Math.ceil(mostFrames / FIRST_BUCKET_FRAMES);
    this.#extremes = kernels.map(({ arena }) => arena.floats(most));
  }

  pushBlock(block: AudioBlock): void {
    const length = block[0]?.length ?? 0;
    let at = 0;
    while (at < length) {
      const whole = Math.floor((length - at) / this.#framesPerBucket);
      if (this.#inBucket === 0 && whole > 0) {
        const count = Math.min(whole, MOST_BUCKETS - this.#buckets);
        const end = at + count * this.#framesPerBucket;
        this.#closeMany(block, at, count);
        at = end;
        continue;
      }
      const end = Math.min(length, at + this.#framesPerBucket - this.#inBucket);
      for (const channel of block) {
        for (let i = at; i < end; i++) {
          const x = channel[i] as number;
          if (x < this.#min) this.#min = x;
          if (x > this.#max) this.#max = x;
        }
      }
      this.#inBucket += end - at;
      at = end;
      if (this.#inBucket === this.#framesPerBucket) this.#close();
    }
    this.#frames += length;
  }

  #closeMany(block: AudioBlock, at: number, count: number): void {
    const size = this.#framesPerBucket;
    block.forEach((channel, c) => {
      this.kernels[c]?.extremes(
        channel.subarray(at, at + count * size),
        count,
        size,
        this.#extremes[c] as Float32Array,
      );
    });
    const first = this.#extremes[0] as Float32Array;
    for (const other of this.#extremes.slice(1)) {
      for (let b = 0; b < 2 * count; b += 2) {
        first[b] = Math.min(first[b] as number, other[b] as number);
        first[b + 1] = Math.max(first[b + 1] as number, other[b + 1] as number);
      }
    }
    const base = 2 * this.#buckets;
    for (let b = 0; b < 2 * count; b++) this.#data[base + b] = toByte(first[b] as number);
    this.#advance(count);
  }

  #close(): void {
    this.#data[this.#buckets * 2] = toByte(this.#min);
    this.#data[this.#buckets * 2 + 1] = toByte(this.#max);
    this.#min = Number.POSITIVE_INFINITY;
    this.#max = Number.NEGATIVE_INFINITY;
    this.#inBucket = 0;
    this.#advance(1);
  }

  #advance(buckets: number): void {
    this.#buckets += buckets;
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

/** Half away from minus infinity, as Math.round does, without its cost. */
const toByte = (x: number): number => {
  const scaled = Math.floor(x * 127 + 0.5);
  return scaled > 127 ? 127 : scaled < -127 ? -127 : scaled;
};

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
