import type { Encoding } from '../types';

/** Turns interleaved bytes of whole frames into one Float32Array a channel, in units of full scale. */
export type SampleReader = (bytes: Uint8Array, frames: number, out: readonly Float32Array[]) => void;

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
  let t = (a & 0x0f) << 4;
  if (segment === 0) t += 8;
  else t = (t + 0x108) << (segment - 1);
  return a & 0x80 ? t : -t;
}

const table = (toLinear: (byte: number) => number): Float32Array =>
  Float32Array.from({ length: 256 }, (_, byte) => toLinear(byte) / 32_768);
const MU_LAW = table(muLawToLinear);
const A_LAW = table(aLawToLinear);

const byteReader =
  (channels: number, value: (byte: number) => number): SampleReader =>
  (bytes, frames, out) => {
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, at = c; i < frames; i++, at += channels) channel[i] = value(bytes[at] as number);
    }
  };

const pcm16 =
  (channels: number, bigEndian: boolean): SampleReader =>
  (bytes, frames, out) => {
    const aligned = bytes.byteOffset % 2 === 0 ? bytes : bytes.slice();
    if (!bigEndian && LITTLE_ENDIAN_HOST) {
      const codes = new Int16Array(aligned.buffer, aligned.byteOffset, frames * channels);
      for (let c = 0; c < channels; c++) {
        const channel = out[c] as Float32Array;
        for (let i = 0, at = c; i < frames; i++, at += channels) channel[i] = (codes[at] as number) / 32_768;
      }
      return;
    }
    const view = new DataView(aligned.buffer, aligned.byteOffset, aligned.byteLength);
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, at = c * 2; i < frames; i++, at += channels * 2)
        channel[i] = view.getInt16(at, !bigEndian) / 32_768;
    }
  };

const pcm24 =
  (channels: number, bigEndian: boolean): SampleReader =>
  (bytes, frames, out) => {
    const low = bigEndian ? 2 : 0;
    const high = bigEndian ? 0 : 2;
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, at = c * 3; i < frames; i++, at += channels * 3) {
        const code =
          ((bytes[at + high] as number) << 24) |
          ((bytes[at + 1] as number) << 16) |
          ((bytes[at + low] as number) << 8);
        channel[i] = (code >> 8) / 8_388_608;
      }
    }
  };

const viewed =
  (channels: number, width: number, read: (view: DataView, at: number) => number): SampleReader =>
  (bytes, frames, out) => {
    const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
    for (let c = 0; c < channels; c++) {
      const channel = out[c] as Float32Array;
      for (let i = 0, at = c * width; i < frames; i++, at += channels * width) channel[i] = read(view, at);
    }
  };

/** @param bytesPerSample width of one sample as stored */
export function sampleReader(
  encoding: Encoding,
  bytesPerSample: number,
  channels: number,
  bigEndian: boolean,
): SampleReader {
  switch (encoding) {
    case 'pcm-u8':
      return byteReader(channels, (byte) => (byte - 128) / 128);
    case 'alaw':
      return byteReader(channels, (byte) => A_LAW[byte] as number);
    case 'mulaw':
      return byteReader(channels, (byte) => MU_LAW[byte] as number);
    case 'float32':
      return viewed(channels, 4, (view, at) => view.getFloat32(at, !bigEndian));
    case 'float64':
      return viewed(channels, 8, (view, at) => view.getFloat64(at, !bigEndian));
    default:
      if (bytesPerSample === 2) return pcm16(channels, bigEndian);
      if (bytesPerSample === 3) return pcm24(channels, bigEndian);
      return viewed(channels, 4, (view, at) => view.getInt32(at, !bigEndian) / 2_147_483_648);
  }
}
