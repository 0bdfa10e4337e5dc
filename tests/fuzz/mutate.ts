import { crc8, crc16, oggCrc } from '@/lib/acoustics/decode/crc';
import type { Random } from './random';

const NUMBERS = [
  0, 1, 2, 7, 8, 255, 256, 0x7fff, 0x8000, 0xffff, 0x7fff_ffff, 0x8000_0000, 0xffff_fffe, 0xffff_ffff,
];
const HEADER_BYTES = 160;

type Mutation = (bytes: Uint8Array, random: Random, other: Uint8Array) => Uint8Array;

/** Headers decide most: half of all changes fall there. */
const place = (bytes: Uint8Array, random: Random): number =>
  random.int(random.chance(2) ? Math.min(HEADER_BYTES, bytes.length) : bytes.length);

const joined = (...parts: Uint8Array[]): Uint8Array => {
  const whole = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    whole.set(part, at);
    at += part.length;
  }
  return whole;
};

const MUTATIONS: readonly Mutation[] = [
  (bytes, random) => {
    const at = place(bytes, random);
    bytes[at] = (bytes[at] ?? 0) ^ (1 << random.int(8));
    return bytes;
  },
  (bytes, random) => {
    bytes[place(bytes, random)] = random.int(256);
    return bytes;
  },
  (bytes, random) => {
    const at = place(bytes, random);
    if (at + 4 <= bytes.length)
      new DataView(bytes.buffer).setUint32(at, random.of(NUMBERS), random.chance(2));
    return bytes;
  },
  (bytes, random) => {
    const at = place(bytes, random);
    if (at + 2 <= bytes.length) new DataView(bytes.buffer).setUint16(at, random.of(NUMBERS) & 0xffff, true);
    return bytes;
  },
  (bytes, random) => bytes.slice(0, random.int(bytes.length + 1)),
  (bytes, random) => {
    const at = place(bytes, random);
    return joined(bytes.subarray(0, at), bytes.subarray(at + 1 + random.int(64)));
  },
  (bytes, random) => {
    const at = place(bytes, random);
    const noise = Uint8Array.from({ length: 1 + random.int(64) }, () => random.int(256));
    return joined(bytes.subarray(0, at), noise, bytes.subarray(at));
  },
  (bytes, random) => {
    const at = random.int(bytes.length);
    return joined(
      bytes.subarray(0, at),
      bytes.subarray(random.int(bytes.length), at + random.int(2000)),
      bytes.subarray(at),
    );
  },
  (bytes, random, other) =>
    joined(bytes.subarray(0, random.int(bytes.length)), other.subarray(random.int(other.length))),
  (bytes, random) => {
    const at = place(bytes, random);
    return bytes.fill(random.of([0, 0xff, 0x55]), at, at + random.int(300));
  },
];

/** Change a copy of a file in up to six ways, and make its checksums agree again half of the time. */
export function mutated(bytes: Uint8Array, other: Uint8Array, random: Random): Uint8Array {
  let changed: Uint8Array = bytes.slice();
  for (let i = random.int(6); i >= 0 && changed.length > 0; i--)
    changed = random.of(MUTATIONS)(changed, random, other);
  if (random.chance(2)) {
    changed = changed.slice();
    mendOgg(changed);
    mendFlac(changed);
  }
  return changed;
}

/** Without true checksums no mutation gets past the pages of an Ogg file. */
function mendOgg(bytes: Uint8Array): void {
  for (let at = 0; at + 27 <= bytes.length; at++) {
    if (String.fromCharCode(...bytes.subarray(at, at + 4)) !== 'OggS') continue;
    const bodyAt = at + 27 + (bytes[at + 26] ?? 0);
    const end = bytes.subarray(at + 27, bodyAt).reduce((sum, length) => sum + length, bodyAt);
    if (end > bytes.length) continue;
    new DataView(bytes.buffer).setUint32(at + 22, oggCrc(bytes.subarray(at, end)), true);
    at = end - 1;
  }
}

/** What stands between two sync codes is taken for a frame: header and frame get true checksums. */
function mendFlac(bytes: Uint8Array): void {
  const starts: number[] = [];
  for (let at = 0; at + 6 < bytes.length; at++)
    if (bytes[at] === 0xff && ((bytes[at + 1] ?? 0) & 0xfe) === 0xf8) starts.push(at);
  for (const [i, start] of starts.entries()) {
    const end = starts[i + 1] ?? bytes.length;
    if (end - start < 16) continue;
    const lengths = [5, 6, 7, 8, 9, 10, 11];
    const headed = lengths.some((length) => crc8(bytes, start, start + length) === bytes[start + length]);
    if (!headed) bytes[start + 5] = crc8(bytes, start, start + 5);
    new DataView(bytes.buffer).setUint16(end - 2, crc16(bytes, start, end - 2));
  }
}
