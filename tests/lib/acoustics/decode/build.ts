import { createDecoder, type DecodeResult } from '@/lib/acoustics/decode/decode';
import type { AudioFormat } from '@/lib/acoustics/types';

/** Files laid byte by byte, so that every lie in them is deliberate. */
export const bytesOf = (...parts: (Uint8Array | number[] | string)[]): Uint8Array => {
  const pieces = parts.map((part) =>
    typeof part === 'string' ? Uint8Array.from(part, (c) => c.charCodeAt(0)) : Uint8Array.from(part),
  );
  const whole = new Uint8Array(pieces.reduce((sum, piece) => sum + piece.length, 0));
  let at = 0;
  for (const piece of pieces) {
    whole.set(piece, at);
    at += piece.length;
  }
  return whole;
};

export const u16 = (value: number): number[] => [value & 0xff, (value >>> 8) & 0xff];
export const u32 = (value: number): number[] => [...u16(value & 0xffff), ...u16(Math.floor(value / 65_536))];
export const u64 = (value: number): number[] => [
  ...u32(value % 2 ** 32),
  ...u32(Math.floor(value / 2 ** 32)),
];

/** A chunk with its pad byte; `size` and `pad` may lie. */
export const chunk = (
  name: string,
  body: Uint8Array | number[],
  lie: { size?: number; pad?: number[] } = {},
) => bytesOf(name, u32(lie.size ?? body.length), body, lie.pad ?? (body.length % 2 === 1 ? [0] : []));

export interface Fmt {
  tag?: number;
  channels?: number;
  rateHz?: number;
  bits?: number;
  byteRate?: number;
  blockAlign?: number;
  more?: number[];
}

export function fmt(f: Fmt = {}): Uint8Array {
  const { tag = 1, channels = 1, rateHz = 8000, bits = 16, more = [] } = f;
  const frame = channels * Math.ceil(bits / 8);
  const { byteRate = (frame * rateHz) % 2 ** 32, blockAlign = frame & 0xffff } = f;
  return chunk(
    'fmt ',
    bytesOf(u16(tag), u16(channels), u32(rateHz), u32(byteRate), u16(blockAlign), u16(bits), more),
  );
}

/** The tail of a WAVE_FORMAT_EXTENSIBLE fmt chunk: valid bits, speakers, and the tag in its GUID (Microsoft). */
export const extension = (validBits: number, tag: number, guidTail?: number[]): number[] => [
  ...u16(22),
  ...u16(validBits),
  ...u32(0),
  ...u16(tag),
  ...(guidTail ?? [0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]),
];

export const riff = (chunks: Uint8Array[], lie: { magic?: string; size?: number } = {}): Uint8Array => {
  const body = bytesOf('WAVE', ...chunks);
  return bytesOf(lie.magic ?? 'RIFF', u32(lie.size ?? body.length), body);
};

export const codes16 = (codes: readonly number[]): Uint8Array =>
  bytesOf(...codes.map((code) => u16(code & 0xffff)));

/** A plain 16-bit mono file of these codes. */
export const plainWav = (codes: readonly number[]): Uint8Array =>
  riff([fmt(), chunk('data', codes16(codes))]);

export interface Pieced extends DecodeResult {
  channels: number[][];
  blockLengths: number[];
  formats: AudioFormat[];
}

/** Decode in pieces whose sizes repeat. */
export async function inPieces(
  bytes: Uint8Array,
  sizes: readonly number[],
  options: Partial<Parameters<typeof createDecoder>[0]> = {},
): Promise<Pieced> {
  const channels: number[][] = [];
  const blockLengths: number[] = [];
  const formats: AudioFormat[] = [];
  const decoder = createDecoder({
    onFormat: (format) => formats.push(structuredClone(format)),
    onBlock: (block) => {
      blockLengths.push(block[0]?.length ?? 0);
      block.forEach((channel, c) => {
        channels[c] ??= [];
        for (const x of channel) channels[c].push(x);
      });
    },
    ...options,
  });
  for (let at = 0, i = 0; at < bytes.length; i++) {
    const size = Math.max(1, sizes[i % sizes.length] ?? bytes.length);
    // A copy at an odd place: nothing may depend on where the bytes lie.
    const own = new Uint8Array(size + 1);
    const piece = bytes.subarray(at, at + size);
    own.set(piece, 1);
    await decoder.push(own.subarray(1, 1 + piece.length));
    at += size;
  }
  return { ...(await decoder.end()), channels, blockLengths, formats };
}

/** Where two decodings first differ, in words; '' when nowhere. Comparing millions of samples by matcher takes minutes. */
export function difference(a: readonly Float32Array[], b: readonly Float32Array[], tolerance = 0): string {
  if (a.length !== b.length) return `${a.length} channels against ${b.length}`;
  for (const [c, left] of a.entries()) {
    const right = b[c] as Float32Array;
    if (left.length !== right.length) return `${left.length} samples against ${right.length} in channel ${c}`;
    for (let i = 0; i < left.length; i++) {
      const [x, y] = [left[i] as number, right[i] as number];
      if (!(Math.abs(x - y) <= tolerance)) return `${x} against ${y} at sample ${i} of channel ${c}`;
    }
  }
  return '';
}

export const planar = (interleaved: Float32Array, channels: number): Float32Array[] => {
  const frames = Math.floor(interleaved.length / channels);
  return Array.from({ length: channels }, (_, c) =>
    Float32Array.from({ length: frames }, (_x, i) => interleaved[i * channels + c] as number),
  );
};
