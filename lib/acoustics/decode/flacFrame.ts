import { crc16 } from './crc';
import type { FrameHeader, StreamInfo } from './flacHeader';

/** Bytes that must be readable behind the last one of a frame, so that a window of bits may reach over the end. */
export const SLACK_BYTES = 8;

const COEFFICIENTS_MOST = 32;

/** The bytes end before the frame does, or it is not one. Values, because throwing would cost more than decoding. */
const SHORT = -1;
const BAD = -2;

/**
 * Decodes FLAC frames (RFC 9639, 9). Samples are kept as doubles, in which every sum that the format allows is exact;
 * what hostile frames make of them is found by its size.
 */
export class FlacFrameDecoder {
  /** The last frame's samples as integers, a channel each. */
  readonly channels: Float64Array[];
  #bytes: Uint8Array = new Uint8Array(SLACK_BYTES);
  #view: DataView = new DataView(this.#bytes.buffer);
  /** Position in bits, and where the bits end. */
  #bit = 0;
  #end = 0;
  readonly #coefficients = new Float64Array(COEFFICIENTS_MOST);

  constructor(private readonly info: StreamInfo) {
    this.channels = Array.from({ length: info.channels }, () => new Float64Array(0));
  }

  /**
   * Decode the frame whose header stands at `at`.
   *
   * @param bytes readable up to SLACK_BYTES behind `end`
   * @param end where the bytes end that are there
   * @returns the frame's length in bytes; -1: it needs more bytes; -2: it is damaged
   */
  decode(bytes: Uint8Array, at: number, end: number, header: FrameHeader): number {
    if (this.#bytes !== bytes) {
      this.#bytes = bytes;
      this.#view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
    }
    this.#bit = (at + header.bytes) * 8;
    this.#end = end * 8;
    for (let c = 0; c < this.channels.length; c++) {
      if ((this.channels[c] as Float64Array).length < header.blockSize)
        this.channels[c] = new Float64Array(Math.max(4608, header.blockSize));
      const side =
        (c === 1 && (header.stereo === 'left-side' || header.stereo === 'mid-side')) ||
        (c === 0 && header.stereo === 'side-right');
      const done = this.#subframe(
        this.channels[c] as Float64Array,
        header.blockSize,
        this.info.bitDepth + (side ? 1 : 0),
      );
      if (done !== 0) return done;
    }
    const body = (this.#bit + 7) >>> 3;
    if (body + 2 > end) return SHORT;
    if (crc16(bytes, at, body) !== (((bytes[body] as number) << 8) | (bytes[body + 1] as number))) return BAD;
    this.#join(header);
    return this.#inRange(header.blockSize) ? body + 2 - at : BAD;
  }

  /** Undo the pairing of two channels (RFC 9639, 4.2). */
  #join({ stereo, blockSize }: FrameHeader): void {
    if (stereo === 'independent') return;
    const [first, second] = this.channels as [Float64Array, Float64Array];
    for (let i = 0; i < blockSize; i++) {
      const a = first[i] as number;
      const b = second[i] as number;
      if (stereo === 'left-side') second[i] = a - b;
      else if (stereo === 'side-right') first[i] = a + b;
      else {
        // The bit that the mean lost is the difference's lowest.
        const sum = 2 * a + Math.abs(b % 2);
        first[i] = (sum + b) / 2;
        second[i] = (sum - b) / 2;
      }
    }
  }

  #inRange(blockSize: number): boolean {
    const most = 2 ** (this.info.bitDepth - 1);
    for (const channel of this.channels)
      for (let i = 0; i < blockSize; i++) {
        const x = channel[i] as number;
        if (!(x >= -most && x < most)) return false;
      }
    return true;
  }

  /** The next 32 bits, in the order they stand. */
  #window(): number {
    const at = this.#bit >>> 3;
    const shift = this.#bit & 7;
    return (this.#view.getUint32(at) << shift) | ((this.#bytes[at + 4] as number) >>> (8 - shift));
  }

  /** @param count 1 to 25 bits, at most 32 of them there */
  #unsigned(count: number): number {
    if (this.#bit >= this.#end) return 0;
    const value = this.#window() >>> (32 - count);
    this.#bit += count;
    return value;
  }

  /** @param count 1 to 33 bits */
  #signed(count: number): number {
    if (this.#bit >= this.#end) return 0;
    if (count <= 32) {
      const value = this.#window() >> (32 - count);
      this.#bit += count;
      return value;
    }
    const high = this.#window() >> 31;
    this.#bit += 1;
    const low = this.#window() >>> 0;
    this.#bit += 32;
    return high * 2 ** 32 + low;
  }

  #overran(): boolean {
    return this.#bit > this.#end;
  }

  /** RFC 9639, 9.2. @returns 0, SHORT or BAD */
  #subframe(out: Float64Array, blockSize: number, depth: number): number {
    if (this.#bit + 8 > this.#end) return SHORT;
    const head = this.#unsigned(8);
    if (head & 0x80) return BAD;
    const type = (head >> 1) & 0x3f;
    let wasted = 0;
    if (head & 1) {
      const run = this.#window();
      if (run === 0) return this.#bit + 32 > this.#end ? SHORT : BAD;
      wasted = Math.clz32(run) + 1;
      this.#bit += wasted;
      if (wasted >= depth) return BAD;
    }
    const bits = depth - wasted;
    let done: number;
    if (type === 0) done = this.#constant(out, blockSize, bits);
    else if (type === 1) done = this.#verbatim(out, 0, blockSize, bits);
    else if (type >= 8 && type <= 12) done = this.#fixed(out, blockSize, bits, type - 8);
    else if (type >= 32) done = this.#linear(out, blockSize, bits, type - 31);
    else return BAD;
    if (done === 0 && wasted > 0) {
      const scale = 2 ** wasted;
      for (let i = 0; i < blockSize; i++) out[i] = (out[i] as number) * scale;
    }
    return done;
  }

  #constant(out: Float64Array, blockSize: number, bits: number): number {
    const value = this.#signed(bits);
    if (this.#overran()) return SHORT;
    out.fill(value, 0, blockSize);
    return 0;
  }

  #verbatim(out: Float64Array, from: number, to: number, bits: number): number {
    if (this.#bit + (to - from) * bits > this.#end) return SHORT;
    for (let i = from; i < to; i++) out[i] = this.#signed(bits);
    return 0;
  }

  /** RFC 9639, 9.2.5. */
  #fixed(out: Float64Array, blockSize: number, bits: number, order: number): number {
    if (order > blockSize) return BAD;
    const done = this.#verbatim(out, 0, order, bits) || this.#residual(out, blockSize, order);
    if (done !== 0) return done;
    // Each order's predictor is a running sum more; doing them one by one is the same and needs no case of its own.
    const x = (i: number) => out[i] as number;
    if (order === 1) for (let i = 1; i < blockSize; i++) out[i] = x(i) + x(i - 1);
    else if (order === 2) for (let i = 2; i < blockSize; i++) out[i] = x(i) + 2 * x(i - 1) - x(i - 2);
    else if (order === 3)
      for (let i = 3; i < blockSize; i++) out[i] = x(i) + 3 * x(i - 1) - 3 * x(i - 2) + x(i - 3);
    else if (order === 4)
      for (let i = 4; i < blockSize; i++)
        out[i] = x(i) + 4 * x(i - 1) - 6 * x(i - 2) + 4 * x(i - 3) - x(i - 4);
    return 0;
  }

  /** RFC 9639, 9.2.6. */
  #linear(out: Float64Array, blockSize: number, bits: number, order: number): number {
    if (order > blockSize) return BAD;
    const warm = this.#verbatim(out, 0, order, bits);
    if (warm !== 0) return warm;
    if (this.#bit + 9 > this.#end) return SHORT;
    const precision = this.#unsigned(4) + 1;
    const shift = this.#signed(5);
    if (precision === 16 || shift < 0) return BAD;
    if (this.#bit + order * precision > this.#end) return SHORT;
    const coefficients = this.#coefficients;
    for (let k = 0; k < order; k++) coefficients[k] = this.#signed(precision);
    const done = this.#residual(out, blockSize, order);
    if (done !== 0) return done;
    const scale = 2 ** -shift;
    for (let i = order; i < blockSize; i++) {
      let sum = 0;
      for (let k = 0, j = i - 1; k < order; k++, j--) sum += (coefficients[k] as number) * (out[j] as number);
      out[i] = (out[i] as number) + Math.floor(sum * scale);
    }
    return 0;
  }

  /** The coded residual (RFC 9639, 9.2.7), written where the samples will be. */
  #residual(out: Float64Array, blockSize: number, order: number): number {
    if (this.#bit + 6 > this.#end) return SHORT;
    const method = this.#unsigned(2);
    if (method > 1) return BAD;
    const parameterBits = method === 0 ? 4 : 5;
    const escaped = method === 0 ? 15 : 31;
    const partitionOrder = this.#unsigned(4);
    const partition = blockSize >> partitionOrder;
    if (partition << partitionOrder !== blockSize || partition < order) return BAD;
    for (let from = order, to = partition; to <= blockSize; from = to, to += partition) {
      if (this.#bit + parameterBits > this.#end) return SHORT;
      const parameter = this.#unsigned(parameterBits);
      let done: number;
      if (parameter !== escaped) done = this.#rice(out, from, to, parameter);
      else {
        const bits = this.#unsigned(5);
        if (bits === 0) {
          out.fill(0, from, to);
          done = 0;
        } else done = this.#verbatim(out, from, to, bits);
      }
      if (done !== 0) return done;
    }
    return this.#overran() ? SHORT : 0;
  }

  /** One partition of Rice codes: a run of zeros, a one, `parameter` bits; the sign is the lowest bit. */
  #rice(out: Float64Array, from: number, to: number, parameter: number): number {
    const view = this.#view;
    const bytes = this.#bytes;
    const end = this.#end;
    let bit = this.#bit;
    for (let i = from; i < to; i++) {
      if (bit >= end) return SHORT;
      let window =
        (view.getUint32(bit >>> 3) << (bit & 7)) | ((bytes[(bit >>> 3) + 4] as number) >>> (8 - (bit & 7)));
      let zeros = 0;
      while (window === 0) {
        zeros += 32;
        bit += 32;
        if (bit >= end) return SHORT;
        window =
          (view.getUint32(bit >>> 3) << (bit & 7)) | ((bytes[(bit >>> 3) + 4] as number) >>> (8 - (bit & 7)));
      }
      const run = Math.clz32(window);
      bit += run + 1;
      let code = zeros + run;
      if (parameter > 0) {
        // The bits of the same window, where they are still in it.
        let low: number;
        if (run + 1 + parameter <= 32) low = (window << (run + 1)) >>> (32 - parameter);
        else {
          if (bit >= end) return SHORT;
          const at = bit >>> 3;
          const shift = bit & 7;
          low =
            ((view.getUint32(at) << shift) | ((bytes[at + 4] as number) >>> (8 - shift))) >>>
            (32 - parameter);
        }
        bit += parameter;
        code = (code << parameter) | low;
      }
      out[i] = (code >>> 1) ^ -(code & 1);
    }
    this.#bit = bit;
    return bit > end ? SHORT : 0;
  }
}
