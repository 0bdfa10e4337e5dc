import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { decodeWhole } from '@/lib/acoustics/decode/decode';
import { aLawToLinear, muLawToLinear } from '@/lib/acoustics/decode/samples';
import { soundRoom } from '../../../support/sound';
import { chunk, codes16, difference, fmt, riff } from './build';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  room.sox('-R', '-n', '-r', '8000', '-b', '16', '-c', '1', 'plain.wav', 'synth', '12', 'sine', '200');
  room.ffmpeg('-bitexact', '-i', 'plain.wav', '-c:a', 'pcm_s16le', '-rf64', 'always', 'long.wav');
});
afterAll(() => room.close());

/** Where a chunk's body begins. */
function bodyOf(bytes: Uint8Array, name: string): DataView {
  const at = [...bytes.keys()].find((i) => String.fromCharCode(...bytes.subarray(i, i + 4)) === name) ?? 0;
  return new DataView(bytes.buffer, at + 8);
}

// RIFF rule: 12 s of 8 kHz mono 16-bit in a plain header of 44 bytes.
test('a plain header holds the values that RIFF asks for, and is read as such', async () => {
  const bytes = room.read('plain.wav');
  const view = new DataView(bytes.buffer);
  expect(bytes.length).toBe(44 + 192_000);
  expect([
    view.getUint32(4, true),
    view.getUint32(28, true),
    view.getUint16(32, true),
    view.getUint32(40, true),
  ]).toEqual([192_036, 16_000, 2, 192_000]);
  const read = await decodeWhole(bytes);
  expect(read).toMatchObject({ frames: 96_000, declaredFrames: 96_000, missingFrames: 0 });
  expect(read.format?.oddities).toEqual([]);
});

// EBU Tech 3306 (from memory); values measured on what ffmpeg 5.1 writes.
test('the 64-bit sizes of RF64 are those of the sound', async () => {
  const bytes = room.read('long.wav');
  const ds64 = bodyOf(bytes, 'ds64');
  expect(new DataView(bytes.buffer, ds64.byteOffset - 4).getUint32(0, true)).toBe(28);
  expect([0, 8, 16].map((at) => Number(ds64.getBigUint64(at, true)))).toEqual([
    bytes.length - 8,
    192_000,
    96_000,
  ]);
  expect(new DataView(bytes.buffer).getUint32(4, true)).toBe(0xffff_ffff);
  const read = await decodeWhole(bytes);
  expect(read).toMatchObject({ frames: 96_000, declaredFrames: 96_000, missingFrames: 0 });
  expect(read.format).toMatchObject({ container: 'rf64', oddities: [] });
  expect(difference(read.channels, (await decodeWhole(room.read('plain.wav'))).channels)).toBe('');
});

// RIFF specification (from memory).
test('the pad byte of an odd chunk is there and is not counted', async () => {
  const file = riff([chunk('note', [1, 2, 3]), fmt(), chunk('data', codes16([1000, -1000]))]);
  expect(file.length).toBe(12 + (8 + 3 + 1) + (8 + 16) + (8 + 4));
  const read = await decodeWhole(file);
  expect([...(read.channels[0] ?? [])]).toEqual([1000 / 32_768, -1000 / 32_768]);
});

// ITU-T G.711; values computed from its algorithm, from memory.
test('mu-law bytes mean the codes of G.711', () => {
  expect([0x00, 0x80, 0xff, 0x7f, 0xe7].map(muLawToLinear)).toEqual([-32_124, 32_124, 0, 0, 260]);
});

// sox and ffmpeg decode G.711 on their own; all 256 bytes agree with both.
test.each([
  ['mu-law', 'mulaw', 7, muLawToLinear],
  ['A-law', 'alaw', 6, aLawToLinear],
])('all 256 bytes of %s are what sox and ffmpeg make of them', async (_name, raw, tag, toLinear) => {
  const every = Uint8Array.from({ length: 256 }, (_, byte) => byte);
  const file = riff([fmt({ tag, bits: 8 }), chunk('data', every)]);
  writeFileSync(room.at(`${raw}.wav`), file);
  room.ffmpeg('-i', `${raw}.wav`, '-f', 's16le', `${raw}.s16`);
  const codes = [...new Int16Array(room.read(`${raw}.s16`).buffer)];
  expect([...every].map(toLinear)).toEqual(codes);
  const read = await decodeWhole(file);
  expect([...(read.channels[0] ?? [])]).toEqual(codes.map((code) => code / 32_768));
  expect([...room.samples(`${raw}.wav`)]).toEqual(codes.map((code) => code / 32_768));
});
