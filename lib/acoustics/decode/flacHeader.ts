import { crc8 } from './crc';
import { checkFormat, Unreadable } from './types';

/** STREAMINFO (RFC 9639, 8.2). */
export interface StreamInfo {
  /** Frames a block of a stream with blocks of one size; null where sizes vary. */
  blockSize: number | null;
  /** Longest frame in bytes; 0: not said. */
  largestFrameBytes: number;
  sampleRateHz: number;
  channels: number;
  bitDepth: number;
  /** null: not said. */
  totalFrames: number | null;
}

export const STREAMINFO_BYTES = 34;

/**
 * @param body STREAMINFO without its block header
 * @throws Unreadable `rate-out-of-range`, `bit-depth-unknown`
 */
export function readStreamInfo(body: Uint8Array): StreamInfo {
  const byte = (i: number) => body[i] ?? 0;
  const sampleRateHz = (byte(10) << 12) | (byte(11) << 4) | (byte(12) >> 4);
  const channels = ((byte(12) >> 1) & 0x07) + 1;
  const bitDepth = (((byte(12) & 0x01) << 4) | (byte(13) >> 4)) + 1;
  const total =
    (byte(13) & 0x0f) * 2 ** 32 + ((byte(14) << 24) >>> 0) + (byte(15) << 16) + (byte(16) << 8) + byte(17);
  checkFormat(sampleRateHz, channels);
  if (bitDepth < 4) throw new Unreadable('bit-depth-unknown');
  const smallest = (byte(0) << 8) | byte(1);
  const largest = (byte(2) << 8) | byte(3);
  return {
    blockSize: smallest === largest && smallest >= 16 ? smallest : null,
    largestFrameBytes: (byte(7) << 16) | (byte(8) << 8) | byte(9),
    sampleRateHz,
    channels,
    bitDepth,
    totalFrames: total === 0 ? null : total,
  };
}

/** How two channels are stored (RFC 9639, 9.1.3). */
export type Stereo = 'independent' | 'left-side' | 'side-right' | 'mid-side';

/** A frame's header (RFC 9639, 9.1). */
export interface FrameHeader {
  blockSize: number;
  stereo: Stereo;
  /** Number of the frame, or of its first sample where block sizes vary. */
  number: number;
  countsSamples: boolean;
  /** Length with its checksum. */
  bytes: number;
}

const RATES_HZ = [0, 88_200, 176_400, 192_000, 8000, 16_000, 22_050, 24_000, 32_000, 44_100, 48_000, 96_000];
const BIT_DEPTHS = [0, 8, 12, -1, 16, 20, 24, 32];
const STEREO: readonly Stereo[] = ['left-side', 'side-right', 'mid-side'];

/**
 * Read the header of a frame of this stream.
 *
 * @param end where the bytes end that are there
 * @returns null where there is none, or one that contradicts STREAMINFO; `short` where it needs more bytes
 */
export function readFrameHeader(
  bytes: Uint8Array,
  at: number,
  end: number,
  info: StreamInfo,
): FrameHeader | null | 'short' {
  const byte = (i: number) => bytes[at + i] as number;
  if (end > at && byte(0) !== 0xff) return null;
  if (end - at < 5) return 'short';
  if ((byte(1) & 0xfe) !== 0xf8 || (byte(3) & 0x01) !== 0) return null;
  const sizeCode = byte(2) >> 4;
  const rateCode = byte(2) & 0x0f;
  const stereo = stereoOf(byte(3) >> 4, info.channels);
  const depth = BIT_DEPTHS[(byte(3) >> 1) & 0x07] as number;
  if (sizeCode === 0 || rateCode === 15 || !stereo || (depth !== 0 && depth !== info.bitDepth)) return null;
  const number = readNumber(bytes, at + 4, end);
  if (number === null || number === 'short') return number;
  let next = at + 4 + number.bytes;
  const sizeBytes = sizeCode === 6 ? 1 : sizeCode === 7 ? 2 : 0;
  const rateBytes = rateCode === 12 ? 1 : rateCode > 12 ? 2 : 0;
  if (end < next + sizeBytes + rateBytes + 1) return 'short';
  const blockSize = blockSizeOf(sizeCode, bytes, next);
  next += sizeBytes;
  if (rateOf(rateCode, bytes, next, info) !== info.sampleRateHz) return null;
  next += rateBytes;
  if (crc8(bytes, at, next) !== bytes[next]) return null;
  return {
    blockSize,
    stereo,
    number: number.value,
    countsSamples: (byte(1) & 1) === 1,
    bytes: next + 1 - at,
  };
}

function stereoOf(code: number, channels: number): Stereo | undefined {
  if (code < 8) return code + 1 === channels ? 'independent' : undefined;
  return channels === 2 ? STEREO[code - 8] : undefined;
}

/** RFC 9639, 9.1.1. */
function blockSizeOf(code: number, bytes: Uint8Array, at: number): number {
  if (code === 1) return 192;
  if (code < 6) return 144 << code;
  if (code === 6) return (bytes[at] as number) + 1;
  if (code === 7) return (((bytes[at] as number) << 8) | (bytes[at + 1] as number)) + 1;
  return 1 << code;
}

/** RFC 9639, 9.1.2. */
function rateOf(code: number, bytes: Uint8Array, at: number, info: StreamInfo): number {
  if (code === 0) return info.sampleRateHz;
  if (code < 12) return RATES_HZ[code] as number;
  if (code === 12) return (bytes[at] as number) * 1000;
  const word = ((bytes[at] as number) << 8) | (bytes[at + 1] as number);
  return code === 13 ? word : word * 10;
}

/** A number in the extended UTF-8 of RFC 9639, 9.1.5, of up to 36 bits. */
function readNumber(bytes: Uint8Array, at: number, end: number) {
  const first = bytes[at] as number;
  if (first < 0x80) return { value: first, bytes: 1 };
  const length = Math.clz32(~(first << 24));
  if (length < 2 || length > 7) return null;
  if (end < at + length) return 'short' as const;
  let value = first & (0x7f >> length);
  for (let i = 1; i < length; i++) {
    const next = bytes[at + i] as number;
    if ((next & 0xc0) !== 0x80) return null;
    value = value * 64 + (next & 0x3f);
  }
  return { value, bytes: length };
}
