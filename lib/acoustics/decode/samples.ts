import type { Encoding } from '../types';

/**
 * Turns whole interleaved frames into one Float32Array a channel, in units of full scale.
 *
 * @param out one array a channel; frame 0 goes to index `at`
 */
export type SampleReader = (
  bytes: Uint8Array,
  frames: number,
  out: readonly Float32Array[],
  at: number,
) => void;

const LITTLE_ENDIAN_HOST = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

/** ITU-T G.711 mu-law: byte to 16-bit linear code. */
export function muLawToLinear(byte: number): number {
  const u = ~byte & 0xff;
  const magnitude = (((u & 0x0f) << 3) + 0x84) << ((u & 0x70) >> 4);
  return u & 0x80 ? 0x84 - magnitude : magnitude - 0x84;
}

/** ITU-T G.711 A-law: byte to 16-bit linear code. */
export function aLawToLinear(byte: number): number {
  const a = byte ^ 0x55;
  const segment = (a & 0x70) >> 4;
  const step = ((a & 0x0f) << 4) + 8;
  const magnitude = segment === 0 ? step : (step + 0x100) << (segment - 1);
  return a & 0x80 ? magnitude : -magnitude;
}

const table = (value: (byte: number) => number): Float32Array =>
  Float32Array.from({ length: 256 }, (_, byte) => value(byte));
const UNSIGNED_8 = table((byte) => (byte - 128) / 128);
const MU_LAW = table((byte) => muLawToLinear(byte) / 32_768);
const A_LAW = table((byte) => aLawToLinear(byte) / 32_768);

const ofBytes =
  (channels: number, values: Float32Array): SampleReader =>
  (bytes, frames, out, at) => {
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, k = c; i < frames; i++, k += channels)
        channel[at + i] = values[bytes[k] as number] as number;
    }
  };

const of24 =
  (channels: number, bigEndian: boolean): SampleReader =>
  (bytes, frames, out, at) => {
    const low = bigEndian ? 2 : 0;
    const high = bigEndian ? 0 : 2;
    const stride = channels * 3;
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, k = c * 3; i < frames; i++, k += stride) {
        const code =
          ((bytes[k + high] as number) << 24) |
          ((bytes[k + 1] as number) << 16) |
          ((bytes[k + low] as number) << 8);
        // 24 bits fit a Float32's significand, so this is exact.
        channel[at + i] = code * 2 ** -31;
      }
    }
  };

type Codes = Int16Array | Int32Array | Float32Array | Float64Array;

/** Samples that a typed array can be laid over: 2, 4 or 8 bytes, in the host's byte order after `prepare`. */
const ofWords =
  (
    channels: number,
    bigEndian: boolean,
    kind: { new (buffer: ArrayBufferLike, at: number, length: number): Codes; BYTES_PER_ELEMENT: number },
    scale: number,
  ): SampleReader =>
  (bytes, frames, out, at) => {
    const width = kind.BYTES_PER_ELEMENT;
    let laid = bytes;
    if (bigEndian === LITTLE_ENDIAN_HOST) laid = reversed(bytes, width, frames * channels);
    else if (bytes.byteOffset % width !== 0) laid = bytes.slice(0, frames * channels * width);
    const codes = new kind(laid.buffer, laid.byteOffset, frames * channels);
    if (codes instanceof Int16Array) spread16(codes, channels, frames, out, at);
    else spread(codes, scale, channels, frames, out, at);
  };

/** The commonest case by far, in a loop of its own so that it is compiled for it. */
function spread16(
  codes: Int16Array,
  channels: number,
  frames: number,
  out: readonly Float32Array[],
  at: number,
) {
  for (let c = 0; c < channels; c++) {
    const channel = out[c] as Float32Array;
    for (let i = 0, k = c; i < frames; i++, k += channels) channel[at + i] = (codes[k] as number) * 2 ** -15;
  }
}

function spread(
  codes: Codes,
  scale: number,
  channels: number,
  frames: number,
  out: readonly Float32Array[],
  at: number,
) {
  for (let c = 0; c < channels; c++) {
    const channel = out[c] as Float32Array;
    for (let i = 0, k = c; i < frames; i++, k += channels) channel[at + i] = (codes[k] as number) * scale;
  }
}

function reversed(bytes: Uint8Array, width: number, words: number): Uint8Array {
  const turned = new Uint8Array(words * width);
  for (let i = 0; i < turned.length; i += width)
    for (let k = 0; k < width; k++) turned[i + k] = bytes[i + width - 1 - k] as number;
  return turned;
}

/**
 * A reader for one way of storing samples. Valid bits stand at the top of their container (WAVE_FORMAT_EXTENSIBLE),
 * so that the container's width alone decides what full scale is.
 *
 * @param bytesPerSample width of one sample as stored
 */
export function sampleReader(
  encoding: Encoding,
  bytesPerSample: number,
  channels: number,
  bigEndian: boolean,
): SampleReader {
  switch (encoding) {
    case 'pcm-u8':
      return ofBytes(channels, UNSIGNED_8);
    case 'alaw':
      return ofBytes(channels, A_LAW);
    case 'mulaw':
      return ofBytes(channels, MU_LAW);
    case 'float32':
      return ofWords(channels, bigEndian, Float32Array, 1);
    case 'float64':
      return ofWords(channels, bigEndian, Float64Array, 1);
    default:
      if (bytesPerSample === 2) return ofWords(channels, bigEndian, Int16Array, 2 ** -15);
      if (bytesPerSample === 3) return of24(channels, bigEndian);
      return ofWords(channels, bigEndian, Int32Array, 2 ** -31);
  }
}
