import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { oggCrc } from '@/lib/acoustics/decode/crc';
import { decodeWhole } from '@/lib/acoustics/decode/decode';
import { soundRoom } from '../../../support/sound';
import { bytesOf, difference, planar } from './build';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  const breath = ['synth', '3.137', 'pinknoise', 'sine', '300', 'tremolo', '2', '60', 'gain', '-8'];
  for (const channels of ['1', '2'])
    room.sox('-R', '-n', '-r', '16000', '-b', '16', '-c', channels, `c${channels}.wav`, ...breath);
});
afterAll(() => room.close());

const byFfmpeg = (name: string, channels: number, decoder: readonly string[] = []): Float32Array[] => {
  room.ffmpeg(...decoder, '-i', name, '-f', 'f32le', '-c:a', 'pcm_f32le', `${name}.raw`);
  return planar(new Float32Array(room.read(`${name}.raw`).buffer), channels);
};
const pack = (name: string, args: readonly string[], source = 'c2.wav'): Uint8Array => {
  room.ffmpeg('-i', source, ...args, name);
  return room.read(name);
};

const OPUS = ['-c:a', 'libopus', '-b:a', '48k'];
const VORBIS = ['-c:a', 'libvorbis'];
const MP3 = ['-c:a', 'libmp3lame', '-b:a', '96k'];

// ffmpeg decodes Vorbis and MP3 with code of its own: as many samples, and the same ones but for rounding. Its own Opus
// resamples speech modes in another way (RFC 6716, 4.2.9 leaves that open), so for Opus it is told to use libopus, which
// gives it 16 bits: at most two codes apart.
describe.each([
  ['opus.ogg', OPUS, 'opus', 48_000, 'audio/opus', 2 ** -14],
  ['vorbis.ogg', VORBIS, 'vorbis', 16_000, 'audio/ogg', 1e-5],
  ['sound.mp3', MP3, 'mp3', 16_000, 'audio/mpeg', 1e-5],
  ['44.mp3', [...MP3, '-ar', '44100'], 'mp3', 44_100, 'audio/mpeg', 1e-5],
  ['8.mp3', ['-c:a', 'libmp3lame', '-ar', '8000'], 'mp3', 8000, 'audio/mpeg', 1e-5],
  ['varying.mp3', ['-c:a', 'libmp3lame', '-q:a', '5'], 'mp3', 16_000, 'audio/mpeg', 1e-5],
  ['bare.mp3', [...MP3, '-write_xing', '0', '-id3v2_version', '0'], 'mp3', 16_000, 'audio/mpeg', 1e-5],
] as const)('%s', (name, args, encoding, rate, mediaType, tolerance) => {
  test.each([1, 2])(
    'with %i channels is as long as ffmpeg makes it, and sounds the same',
    async (channels) => {
      const file = `${channels}-${name}`;
      const read = await decodeWhole(pack(file, args, `c${channels}.wav`), mediaType);
      expect(read).toMatchObject({ ok: true, missingFrames: 0, nonFinite: 0, typeMatches: true });
      expect(read.format).toMatchObject({
        encoding,
        lossy: true,
        sampleRateHz: rate,
        channels,
        bitDepth: null,
        oddities: [],
      });
      expect(
        difference(
          read.channels,
          byFfmpeg(file, channels, encoding === 'opus' ? ['-c:a', 'libopus'] : []),
          tolerance,
        ),
      ).toBe('');
    },
  );
});

test('Opus remembers the rate that its encoder was given, and decodes at 48 kHz', async () => {
  room.ffmpeg('-i', 'c1.wav', ...OPUS, 'rate.opus');
  const bytes = room.read('rate.opus');
  const at = bytes.findIndex((_, i) => String.fromCharCode(...bytes.subarray(i, i + 8)) === 'OpusHead');
  new DataView(bytes.buffer).setUint32(at + 12, 4000, true);
  const read = await decodeWhole(sealed(bytes));
  expect(read.format).toMatchObject({ sampleRateHz: 48_000, sourceSampleRateHz: 4000 });
});

/** The first page with a true checksum again. */
function sealed(bytes: Uint8Array, at = 0): Uint8Array {
  const bodyAt = at + 27 + (bytes[at + 26] ?? 0);
  const end = bytes.subarray(at + 27, bodyAt).reduce((sum, length) => sum + length, bodyAt);
  new DataView(bytes.buffer).setUint32(at + 22, oggCrc(bytes.subarray(at, end)), true);
  return bytes;
}

/** Where the pages of an Ogg file begin. */
const pagesOf = (bytes: Uint8Array): number[] =>
  [...bytes.keys()].filter((i) => String.fromCharCode(...bytes.subarray(i, i + 5)) === 'OggS\u0000');

// RFC 7845, 5.1: the gain is in 1/256 dB and belongs to the decoded sound.
test('the output gain of Opus is applied', async () => {
  const bytes = pack('gain.opus', OPUS);
  const plain = await decodeWhole(bytes);
  const at = bytes.findIndex((_, i) => String.fromCharCode(...bytes.subarray(i, i + 8)) === 'OpusHead');
  new DataView(bytes.buffer).setInt16(at + 16, -6 * 256, true);
  const quieter = await decodeWhole(sealed(bytes));
  const factor = 10 ** (-6 / 20);
  const expected = plain.channels.map((channel) => channel.map((x) => x * factor));
  expect(difference(quieter.channels, expected, 1e-6)).toBe('');
});

describe.each([
  ['opus', OPUS, 48_000],
  ['vorbis', VORBIS, 16_000],
])('Ogg %s that is not whole', (name, args, rate) => {
  const file = () => pack(`${name}-parts.ogg`, ['-t', '3', ...args, '-page_duration', '200000']);

  test('a file that was cut within a page misses what that page would have held', async () => {
    const bytes = file();
    const whole = await decodeWhole(bytes);
    const pages = pagesOf(bytes);
    const last = pages.at(-2) ?? 0;
    const read = await decodeWhole(bytes.slice(0, last + 60));
    expect(read.ok).toBe(true);
    expect(read.format?.oddities).toEqual(['end-page-missing']);
    expect(read.missingFrames).toBeGreaterThan(rate / 20);
    expect(read.frames + read.missingFrames).toBeLessThanOrEqual(whole.frames + rate / 10);
    expect(
      difference(
        read.channels,
        whole.channels.map((c) => c.subarray(0, read.frames)),
      ),
    ).toBe('');
  });
  test('a page that was damaged or lost is missed by its positions', async () => {
    const bytes = file();
    const whole = await decodeWhole(bytes);
    const pages = pagesOf(bytes);
    const middle = pages[Math.floor(pages.length / 2)] ?? 0;
    const next = pages[Math.floor(pages.length / 2) + 1] ?? 0;
    const damaged = bytes.slice();
    damaged[middle + 100] = (damaged[middle + 100] ?? 0) ^ 1;
    const lost = bytesOf(bytes.subarray(0, middle), bytes.subarray(next));
    for (const [broken, oddities] of [
      [damaged, ['pages-damaged', 'pages-missing', 'stray-bytes']],
      [lost, ['pages-missing']],
    ] as const) {
      const read = await decodeWhole(broken);
      expect(read.ok).toBe(true);
      expect(read.format?.oddities).toEqual(oddities);
      expect(read.missingFrames).toBeGreaterThan(rate / 20);
      // What a codec overlaps across the gap is lost or made up: one block at most.
      expect(Math.abs(read.frames + read.missingFrames - whole.frames)).toBeLessThan(rate / 10);
    }
  });
  test('a header without sound is empty', async () => {
    const bytes = file();
    const read = await decodeWhole(bytes.slice(0, pagesOf(bytes)[2]));
    expect(read).toMatchObject({ ok: false, failure: 'empty', frames: 0 });
  });
  test('a second recording behind the first is named and left out', async () => {
    const bytes = file();
    const whole = await decodeWhole(bytes);
    const read = await decodeWhole(bytesOf(bytes, pack('other.opus', OPUS, 'c1.wav')));
    expect(read.format?.oddities).toEqual(['chained-streams']);
    expect(difference(read.channels, whole.channels)).toBe('');
  });
});

test('of several streams side by side the first is heard and the others are named', async () => {
  room.ffmpeg('-i', 'c2.wav', '-i', 'c1.wav', '-map', '0', '-map', '1', ...OPUS, 'two.ogg');
  const [both, alone] = [await decodeWhole(room.read('two.ogg')), await decodeWhole(pack('one.ogg', OPUS))];
  expect(both.format).toMatchObject({ channels: 2, oddities: ['other-streams'] });
  expect(both.frames).toBe(alone.frames);
});

test('an Ogg of a codec that is not read says so', async () => {
  const bytes = pack('unknown.ogg', OPUS);
  bytes.set(bytesOf('Speex   '), 28);
  expect(await decodeWhole(sealed(bytes))).toMatchObject({
    failure: 'unreadable',
    reason: 'ogg-codec-unknown',
  });
});

describe('MP3 that is not whole', () => {
  test('a file that was cut misses what its first frame declares', async () => {
    const bytes = pack('cut.mp3', MP3);
    const whole = await decodeWhole(bytes);
    expect(whole.declaredFrames).toBe(whole.frames);
    const read = await decodeWhole(bytes.slice(0, Math.floor(bytes.length / 2)));
    expect(read.ok).toBe(true);
    expect(read.frames + read.missingFrames).toBe(whole.frames);
    expect(read.missingFrames).toBeGreaterThan(16_000);
  });
  test('a file that was cut and declares nothing misses the frame it ends in', async () => {
    const bytes = pack('cut-bare.mp3', [...MP3, '-write_xing', '0', '-id3v2_version', '0']);
    const read = await decodeWhole(bytes.slice(0, bytes.length - 20));
    expect(read).toMatchObject({ ok: true, declaredFrames: null, missingFrames: 576 });
  });
  test('tags before and behind it are no sound and nothing odd', async () => {
    const bytes = pack('tagged.mp3', MP3);
    const cover = bytesOf(
      'ID3',
      [4, 0, 0, 0, 3, 0x74, 0x60],
      new Uint8Array(3 * 16_384 + 0x74 * 128 + 0x60).fill(0xff),
    );
    const read = await decodeWhole(bytesOf(cover, bytes, 'TAG', new Uint8Array(125)));
    expect(read).toMatchObject({ ok: true, sniffed: 'mp3' });
    expect(read.format?.oddities).toEqual([]);
    expect(difference(read.channels, (await decodeWhole(bytes)).channels)).toBe('');
  });
  test('bytes between frames are named and passed over', async () => {
    const bytes = pack('stray.mp3', [...MP3, '-write_xing', '0', '-id3v2_version', '0']);
    const whole = await decodeWhole(bytes);
    const frame = Math.floor((576 * 125 * 96) / 16_000);
    const at = frame * 20;
    const read = await decodeWhole(bytesOf(bytes.subarray(0, at), new Uint8Array(500), bytes.subarray(at)));
    expect(read.format?.oddities).toEqual(['stray-bytes']);
    expect(difference(read.channels, whole.channels)).toBe('');
  });
  test('a tag that declares less than there is hides none of it', async () => {
    const bytes = pack('liar.mp3', MP3);
    const whole = await decodeWhole(bytes);
    const at = bytes.findIndex((_, i) => /Info|Xing/.test(String.fromCharCode(...bytes.subarray(i, i + 4))));
    new DataView(bytes.buffer).setUint32(at + 8, 5);
    const read = await decodeWhole(bytes);
    expect(read.format?.oddities).toEqual(['longer-than-declared']);
    expect(Math.abs(read.frames - whole.frames)).toBeLessThan(2 * 1152);
  });
});
