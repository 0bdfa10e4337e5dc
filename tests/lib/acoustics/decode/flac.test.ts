import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { decodeWhole } from '@/lib/acoustics/decode/decode';
import { soundRoom } from '../../../support/sound';
import { bytesOf, difference, planar } from './build';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  const breath = ['synth', '2', 'pinknoise', 'sine', '300', 'tremolo', '2', '60', 'gain', '-8'];
  for (const channels of ['1', '2', '3', '8'])
    room.sox('-R', '-n', '-r', '8000', '-b', '24', '-c', channels, `c${channels}.wav`, ...breath);
});
afterAll(() => room.close());

/** Pack a file and read it back, beside what went in. */
async function packed(name: string, args: readonly string[]) {
  room.flac('--no-padding', ...args, '-o', `${name}.flac`, `${name}.wav`);
  const bytes = room.read(`${name}.flac`);
  return {
    bytes,
    flac: await decodeWhole(bytes, 'audio/flac'),
    wav: await decodeWhole(room.read(`${name}.wav`)),
  };
}

describe('every sample comes back as it was packed', () => {
  test.each([8, 16, 24, 32])('of %i bits', async (bits) => {
    const name = `b${bits}`;
    room.sox('-D', 'c2.wav', '-b', String(bits), `${name}.wav`);
    const { flac, wav } = await packed(name, ['-8']);
    expect(flac).toMatchObject({
      ok: true,
      frames: 16_000,
      declaredFrames: 16_000,
      missingFrames: 0,
      typeMatches: true,
    });
    expect(flac.format).toMatchObject({
      container: 'flac',
      encoding: 'flac',
      lossy: false,
      bitDepth: bits,
      sampleRateHz: 8000,
      channels: 2,
      oddities: [],
    });
    expect(difference(flac.channels, wav.channels)).toBe('');
  });
  test.each([1, 3, 8])('of %i channels', async (channels) => {
    const { flac, wav } = await packed(`c${channels}`, ['--channel-map=none']);
    expect(flac.format).toMatchObject({ channels });
    expect(difference(flac.channels, wav.channels)).toBe('');
  });
  test.each([
    ['fixed predictors', ['-l', '0']],
    ['32 coefficients', ['--lax', '-l', '32', '-r', '15', '-b', '32768']],
    ['the smallest blocks', ['--lax', '-b', '16']],
    ['blocks of an odd size', ['--lax', '-b', '1009']],
    ['the largest blocks', ['--lax', '-b', '65535']],
    ['no pairing of channels', ['--no-mid-side']],
    ['pairing that adapts', ['-2', '-M']],
    ['everything tried', ['-8', '-e', '-p']],
  ])('with %s', async (_name, args) => {
    const { flac, wav } = await packed('c2', args);
    expect(difference(flac.channels, wav.channels)).toBe('');
    expect(flac.format?.oddities).toEqual([]);
  });
  test('of digital silence, full-scale squares and wasted bits', async () => {
    room.sox(
      '-R',
      '-n',
      '-r',
      '8000',
      '-b',
      '16',
      'square.wav',
      'synth',
      '1',
      'square',
      '100',
      'pad',
      '1',
      '1',
    );
    room.sox('-D', 'square.wav', '-b', '24', 'wasted.wav');
    for (const name of ['square', 'wasted']) {
      const { flac, wav } = await packed(name, []);
      expect(flac.frames).toBe(24_000);
      expect(difference(flac.channels, wav.channels)).toBe('');
    }
  });
  test.each([5513, 8000, 16_000, 22_050, 32_000, 44_100, 48_000, 96_000, 176_400, 192_000])(
    'at %i Hz',
    async (rate) => {
      room.sox('-D', 'c1.wav', '-r', String(rate), `r${rate}.wav`, 'trim', '0', '0.3');
      const { flac, wav } = await packed(`r${rate}`, []);
      expect(flac.format?.sampleRateHz).toBe(rate);
      expect(difference(flac.channels, wav.channels)).toBe('');
    },
  );
  test('of noise that cannot be packed', async () => {
    room.sox('-R', '-n', '-r', '8000', '-b', '24', 'noise.wav', 'synth', '1', 'whitenoise');
    const { flac, wav } = await packed('noise', []);
    expect(difference(flac.channels, wav.channels)).toBe('');
  });
});

// Two other implementations: libFLAC's own decoder, and ffmpeg's encoder and decoder.
test('flac, ffmpeg and this decoder agree on each other’s files', async () => {
  room.ffmpeg('-i', 'c2.wav', '-c:a', 'flac', '-compression_level', '12', 'by-ffmpeg.flac');
  room.flac('-o', 'by-flac.flac', 'c2.wav');
  for (const name of ['by-ffmpeg.flac', 'by-flac.flac']) {
    const read = await decodeWhole(room.read(name));
    room.flac('-d', '-o', `${name}.wav`, name);
    room.ffmpeg('-i', name, '-f', 'f32le', `${name}.raw`);
    expect(difference(read.channels, (await decodeWhole(room.read(`${name}.wav`))).channels)).toBe('');
    expect(difference(read.channels, planar(new Float32Array(room.read(`${name}.raw`).buffer), 2))).toBe('');
  }
});

test('FLAC in Ogg is the same sound', async () => {
  room.flac('--ogg', '-o', 'boxed.oga', 'c2.wav');
  room.ffmpeg('-i', 'c2.wav', '-c:a', 'flac', 'streamed.oga');
  const wav = await decodeWhole(room.read('c2.wav'));
  for (const name of ['boxed.oga', 'streamed.oga']) {
    const read = await decodeWhole(room.read(name), 'audio/ogg');
    expect(read).toMatchObject({
      ok: true,
      frames: 16_000,
      missingFrames: 0,
      typeMatches: true,
      sniffed: 'ogg',
    });
    expect(read.format).toMatchObject({
      container: 'ogg',
      encoding: 'flac',
      lossy: false,
      bitDepth: 24,
      oddities: [],
    });
    expect(difference(read.channels, wav.channels)).toBe('');
  }
});

describe('files that are not whole', () => {
  /** 16,000 frames in blocks of 1,000. */
  const blocks = async () => (await packed('c1', ['--lax', '-b', '1000'])).bytes;

  test('a file that was cut says how much is missing', async () => {
    const bytes = await blocks();
    for (const share of [0.3, 0.5, 0.9]) {
      const read = await decodeWhole(bytes.slice(0, Math.floor(bytes.length * share)));
      expect(read.ok).toBe(true);
      expect(read.frames % 1000).toBe(0);
      expect(read.frames + read.missingFrames).toBe(16_000);
      expect(read.missingFrames).toBeGreaterThan(1000);
      expect(read.format?.oddities).toEqual([]);
    }
  });
  test('a file that was cut and declares no length still misses the frame it ends in', async () => {
    const bytes = await blocks();
    bytes.fill(0, 22, 26);
    bytes[21] = (bytes[21] ?? 0) & 0xf0;
    const whole = await decodeWhole(bytes);
    expect(whole).toMatchObject({ frames: 16_000, declaredFrames: null, missingFrames: 0 });
    const read = await decodeWhole(bytes.slice(0, bytes.length - 300));
    expect(read).toMatchObject({ ok: true, frames: 15_000, missingFrames: 1000 });
  });
  test('a damaged frame is left out, counted and named; the others are as they were', async () => {
    const bytes = await blocks();
    const whole = await decodeWhole(bytes);
    const middle = Math.floor(bytes.length / 2);
    bytes[middle] = (bytes[middle] ?? 0) ^ 0x10;
    const read = await decodeWhole(bytes);
    expect(read).toMatchObject({ ok: true, frames: 15_000, missingFrames: 1000 });
    expect(read.format?.oddities).toEqual(['frames-damaged', 'frames-missing', 'stray-bytes']);
    const lost = [...Array(16).keys()].filter((block) => {
      const at = block * 1000;
      return whole.channels[0]?.subarray(at, at + 1000).some((x, i) => x !== read.channels[0]?.[at + i]);
    });
    const first = lost[0] ?? 0;
    expect(
      difference(
        [read.channels[0]?.subarray(first * 1000) ?? new Float32Array(0)],
        [whole.channels[0]?.subarray((first + 1) * 1000) ?? new Float32Array(0)],
      ),
    ).toBe('');
  });
  test('a header without a frame is empty or cut, as it declares', async () => {
    const bytes = await blocks();
    const head = bytes.slice(
      0,
      bytes.findIndex((byte, i) => byte === 0xff && bytes[i + 1] === 0xf8),
    );
    expect(await decodeWhole(head)).toMatchObject({
      failure: 'unreadable',
      reason: 'no-frames',
      missingFrames: 16_000,
    });
    head.fill(0, 22, 26);
    head[21] = (head[21] ?? 0) & 0xf0;
    expect(await decodeWhole(head)).toMatchObject({
      failure: 'empty',
      reason: 'no-samples',
      missingFrames: 0,
    });
  });
  test.each([
    ['0 Hz', (info: Uint8Array) => info.fill(0, 10, 12).fill(0x02, 12, 13), 'rate-out-of-range'],
    [
      'a first block that is not STREAMINFO',
      (_info: Uint8Array, head: Uint8Array) => head.fill(4, 0, 1),
      'streaminfo-missing',
    ],
  ])('%s is unreadable', async (_name, spoil, reason) => {
    const bytes = await blocks();
    spoil(bytes.subarray(8), bytes.subarray(4, 8));
    expect(await decodeWhole(bytes)).toMatchObject({ failure: 'unreadable', reason });
  });
  test('STREAMINFO that contradicts its frames leaves no frame', async () => {
    const bytes = await blocks();
    // 4,000 Hz in place of 8,000 (RFC 9639, 8.2).
    bytes.set([0x00, 0xfa], 18);
    const read = await decodeWhole(bytes);
    expect(read).toMatchObject({ ok: false, frames: 0, missingFrames: 16_000 });
  });
});

describe('what stands around the stream', () => {
  const tag = (length: number) => {
    // Sync codes in a picture must not be taken for frames.
    const body = Uint8Array.from({ length }, (_, i) => (i % 2 === 0 ? 0xff : 0xf8));
    const size = [(length >> 21) & 0x7f, (length >> 14) & 0x7f, (length >> 7) & 0x7f, length & 0x7f];
    return bytesOf('ID3', [4, 0, 0], size, body);
  };
  test.each([0, 10, 53, 54, 55, 1000, 300_000])(
    'a tag of %i bytes before it is passed over',
    async (length) => {
      const { bytes, wav } = await packed('c1', []);
      const read = await decodeWhole(bytesOf(tag(length), bytes), 'audio/flac');
      expect(read).toMatchObject({ ok: true, sniffed: 'flac', typeMatches: true });
      expect(read.format?.oddities).toEqual(['tag-before-sound']);
      expect(difference(read.channels, wav.channels)).toBe('');
    },
  );
  test('a tag with nothing behind it is unreadable', async () => {
    expect(await decodeWhole(tag(100))).toMatchObject({
      failure: 'unreadable',
      reason: 'no-frames',
      format: null,
    });
  });
  test('pictures, padding and other metadata are passed over', async () => {
    room.ffmpeg('-f', 'lavfi', '-i', 'color=red:64x64', '-frames:v', '1', 'cover.png');
    room.flac('--picture=cover.png', '-T', 'TITLE=Left base', '-P', '20000', '-o', 'tagged.flac', 'c1.wav');
    const read = await decodeWhole(room.read('tagged.flac'));
    expect(read).toMatchObject({ ok: true, frames: 16_000 });
    expect(read.format?.oddities).toEqual([]);
  });
  test('bytes behind the last frame are named', async () => {
    const { bytes } = await packed('c1', []);
    const read = await decodeWhole(bytesOf(bytes, 'TAG', new Uint8Array(125)));
    expect(read).toMatchObject({ ok: true, frames: 16_000, missingFrames: 0 });
    expect(read.format?.oddities).toEqual(['trailing-bytes']);
  });
  test('two streams in one file are more than was declared', async () => {
    const { bytes } = await packed('c1', []);
    const read = await decodeWhole(bytesOf(bytes, bytes));
    expect(read).toMatchObject({ ok: true, frames: 32_000, missingFrames: 0 });
    expect(read.format?.oddities).toContain('longer-than-declared');
  });
});
