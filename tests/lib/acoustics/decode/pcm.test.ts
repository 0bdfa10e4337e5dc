import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { decodeWhole } from '@/lib/acoustics/decode/decode';
import { soundRoom } from '../../../support/sound';
import {
  bytesOf,
  chunk,
  codes16,
  difference,
  extension,
  fmt,
  plainWav,
  planar,
  riff,
  u16,
  u32,
} from './build';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  const noise = ['synth', '1', 'whitenoise', 'vol', '0.9'];
  for (const channels of [1, 2, 3, 8])
    room.sox('-R', '-n', '-r', '11025', '-b', '32', '-c', String(channels), `c${channels}.wav`, ...noise);
});
afterAll(() => room.close());

/** What ffmpeg makes of a file, as 32-bit floats, interleaved. */
const byFfmpeg = (name: string): Float32Array => {
  room.ffmpeg('-i', name, '-f', 'f32le', '-c:a', 'pcm_f32le', `${name}.raw`);
  return new Float32Array(room.read(`${name}.raw`).buffer);
};

const ENCODINGS = [
  ['pcm-u8', 'pcm_u8', 8],
  ['pcm-s16', 'pcm_s16le', 16],
  ['pcm-s24', 'pcm_s24le', 24],
  ['pcm-s32', 'pcm_s32le', 32],
  ['float32', 'pcm_f32le', 32],
  ['float64', 'pcm_f64le', 64],
  ['alaw', 'pcm_alaw', 8],
  ['mulaw', 'pcm_mulaw', 8],
] as const;

describe.each(ENCODINGS)('%s', (encoding, codec, bitDepth) => {
  test.each([1, 2, 3, 8])('with %i channels every sample is what ffmpeg reads', async (channels) => {
    const name = `${codec}-${channels}.wav`;
    room.ffmpeg('-i', `c${channels}.wav`, '-c:a', codec, name);
    const read = await decodeWhole(room.read(name), 'audio/wav');
    expect(read).toMatchObject({ ok: true, frames: 11_025, missingFrames: 0, typeMatches: true });
    expect(read.format).toMatchObject({
      container: 'wav',
      encoding,
      bitDepth,
      channels,
      sampleRateHz: 11_025,
      declaredFrames: 11_025,
      lossy: encoding === 'alaw' || encoding === 'mulaw',
      oddities: [],
    });
    expect(difference(read.channels, planar(byFfmpeg(name), channels))).toBe('');
  });
});

test.each(['rf64', 'w32'])(
  'a file of the kind %s that ffmpeg wrote is read with nothing odd about it',
  async (kind) => {
    const args = kind === 'rf64' ? ['-rf64', 'always'] : [];
    room.ffmpeg('-i', 'c2.wav', '-c:a', 'pcm_s24le', ...args, `${kind}.wav`);
    const read = await decodeWhole(room.read(`${kind}.wav`), 'audio/wav');
    expect(read.format).toMatchObject({ container: kind === 'rf64' ? 'rf64' : 'wav', oddities: [] });
    expect(difference(read.channels, planar(byFfmpeg(`${kind}.wav`), 2))).toBe('');
  },
);

test.each(['16', '24', '32'])('a big-endian RIFX file of %s bits that sox wrote is read', async (bits) => {
  room.sox('-D', 'c2.wav', '-b', bits, '-B', `big-${bits}.wav`);
  room.sox('-D', 'c2.wav', '-b', bits, `little-${bits}.wav`);
  const bytes = room.read(`big-${bits}.wav`);
  expect(String.fromCharCode(...bytes.subarray(0, 4))).toBe('RIFX');
  const [big, little] = [await decodeWhole(bytes), await decodeWhole(room.read(`little-${bits}.wav`))];
  expect(big.frames).toBe(11_025);
  expect(difference(big.channels, little.channels)).toBe('');
});

test.each([
  [12, 2, [0x7ff0, 0x8000, 0x0010], [2047 / 2048, -1, 1 / 2048]],
  [20, 3, [0x7ffff0, 0x800000, 0x000010], [524_287 / 524_288, -1, 1 / 524_288]],
  [24, 4, [0x7fffff00, 0x80000000, 0x00000100], [8_388_607 / 8_388_608, -1, 1 / 8_388_608]],
])(
  '%i valid bits at the top of %i bytes are in units of full scale',
  async (validBits, width, codes, expected) => {
    const data = bytesOf(...codes.map((code) => u32(code).slice(0, width)));
    const file = riff([
      fmt({ tag: 0xfffe, bits: width * 8, more: extension(validBits, 1) }),
      chunk('data', data),
    ]);
    const read = await decodeWhole(file);
    expect(read.format).toMatchObject({ bitDepth: validBits, oddities: [] });
    expect([...(read.channels[0] ?? [])]).toEqual(expected);
  },
);

test('a plain format of 12 bits stands in two bytes', async () => {
  const read = await decodeWhole(riff([fmt({ bits: 12 }), chunk('data', codes16([0x7ff0, -32_768]))]));
  expect(read.format).toMatchObject({ encoding: 'pcm-s16', bitDepth: 12, oddities: [] });
  expect([...(read.channels[0] ?? [])]).toEqual([2047 / 2048, -1]);
});

test('24 bits in four bytes are believed where block align and byte rate both say so', async () => {
  const wide = { bits: 24, blockAlign: 4, byteRate: 32_000 };
  const data = bytesOf(u32(0x4000_0000), u32(0xc000_0000));
  const read = await decodeWhole(riff([fmt(wide), chunk('data', data)]));
  expect(read.format).toMatchObject({ encoding: 'pcm-s32', bitDepth: 24, oddities: ['container-wide'] });
  expect([...(read.channels[0] ?? [])]).toEqual([0.5, -0.5]);
  // With one of the two against it, channels and bits decide.
  const tight = await decodeWhole(
    riff([fmt({ ...wide, byteRate: 24_000 }), chunk('data', [0, 0, 0x40, 0, 0, 0xc0])]),
  );
  expect(tight.format).toMatchObject({ encoding: 'pcm-s24', oddities: ['block-align-wrong'] });
  expect([...(tight.channels[0] ?? [])]).toEqual([0.5, -0.5]);
});

test('every 16-bit code is that code by 32,768, exactly', async () => {
  const codes = Array.from({ length: 65_536 }, (_, i) => i - 32_768);
  const read = await decodeWhole(plainWav(codes));
  expect(difference(read.channels, [Float32Array.from(codes, (code) => code / 32_768)])).toBe('');
});

test('floats above full scale are kept, and doubles beyond any float are not finite', async () => {
  const doubles = new Uint8Array(new Float64Array([2.5, -3, 1e300, Number.NaN, 0.25]).buffer);
  const read = await decodeWhole(riff([fmt({ tag: 3, bits: 64 }), chunk('data', doubles)]));
  expect([...(read.channels[0] ?? [])]).toEqual([2.5, -3, 0, 0, 0.25]);
  expect(read).toMatchObject({ ok: true, nonFinite: 2 });
  expect(read.format?.oddities).toEqual(['non-finite-samples']);
});

test('the oldest form of the format, which ends before the bits, is read by its block align', async () => {
  const old = chunk('fmt ', bytesOf(u16(1), u16(1), u32(8000), u32(16_000), u16(2)));
  const read = await decodeWhole(riff([old, chunk('data', codes16([16_384]))]));
  expect(read.format).toMatchObject({ encoding: 'pcm-s16', bitDepth: 16, oddities: [] });
  expect([...(read.channels[0] ?? [])]).toEqual([0.5]);
});
