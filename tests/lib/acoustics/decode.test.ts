import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { createDecoder, decodeWhole } from '@/lib/acoustics/decode/decode';
import { aLawToLinear, muLawToLinear } from '@/lib/acoustics/decode/samples';
import { soundRoom } from '../../support/sound';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  room.sox(
    '-n',
    '-r',
    '8000',
    '-b',
    '24',
    '-c',
    '2',
    'source.wav',
    'synth',
    '2',
    'pinknoise',
    'sine',
    '300',
    'gain',
    '-6',
  );
});
afterAll(() => room.close());

const interleave = (channels: Float32Array[]) => {
  const out = new Float32Array(channels.length * (channels[0]?.length ?? 0));
  for (const [c, channel] of channels.entries()) {
    for (const [i, x] of channel.entries()) out[i * channels.length + c] = x;
  }
  return out;
};

describe('decoded exactly as sox reads it', () => {
  test.each([
    ['8 bit unsigned', ['-b', '8', '-e', 'unsigned-integer'], 'pcm-u8', 8],
    ['16 bit', ['-b', '16'], 'pcm-s16', 16],
    ['24 bit', ['-b', '24'], 'pcm-s24', 24],
    ['32 bit', ['-b', '32', '-e', 'signed-integer'], 'pcm-s32', 32],
    ['float', ['-b', '32', '-e', 'floating-point'], 'float32', 32],
    ['double', ['-b', '64', '-e', 'floating-point'], 'float64', 64],
    ['A-law', ['-e', 'a-law'], 'alaw', 8],
    ['mu-law', ['-e', 'mu-law'], 'mulaw', 8],
  ] as const)('%s', async (name, args, encoding, bitDepth) => {
    const file = `${name.replaceAll(' ', '-')}.wav`;
    room.sox('-D', 'source.wav', ...args, file);
    const read = await decodeWhole(room.read(file));
    expect(read.format).toMatchObject({ encoding, bitDepth, channels: 2, sampleRateHz: 8000 });
    const expected = room.samples(file);
    const got = interleave(read.channels);
    expect(got.length).toBe(expected.length);
    // sox keeps 32 bits inside, so a 32-bit float carries at most one step of rounding.
    expect(Math.max(...got.map((x, i) => Math.abs(x - (expected[i] ?? 0))))).toBeLessThan(2 ** -23);
  });

  test.each([16, 24])('FLAC of %i bit', async (bits) => {
    room.sox('-D', 'source.wav', '-b', String(bits), `flac-${bits}.wav`);
    room.flac(`flac-${bits}.wav`);
    const [wav, flac] = [
      await decodeWhole(room.read(`flac-${bits}.wav`)),
      await decodeWhole(room.read(`flac-${bits}.flac`)),
    ];
    expect(flac.format).toMatchObject({
      container: 'flac',
      encoding: 'flac',
      bitDepth: bits,
      declaredFrames: 16_000,
    });
    expect(flac.channels).toEqual(wav.channels);
  });

  test('RF64 and WAVE_FORMAT_EXTENSIBLE as ffmpeg writes them', async () => {
    room.ffmpeg('-i', 'source.wav', '-c:a', 'pcm_s24le', '-rf64', 'always', 'long.wav');
    const read = await decodeWhole(room.read('long.wav'));
    expect(read.format).toMatchObject({ container: 'rf64', encoding: 'pcm-s24', declaredFrames: 16_000 });
    expect(interleave(read.channels)).toEqual(room.samples('source.wav'));
  });
});

test.each([
  ['opus', ['-c:a', 'libopus'], 48_000],
  ['vorbis', ['-c:a', 'libvorbis'], 8000],
] as const)('Ogg %s is decoded and known to be lossy', async (encoding, args, rate) => {
  room.ffmpeg('-i', 'source.wav', ...args, `${encoding}.ogg`);
  const read = await decodeWhole(room.read(`${encoding}.ogg`), 'audio/ogg');
  expect(read.format).toMatchObject({ container: 'ogg', encoding, lossy: true, sampleRateHz: rate });
  expect(read.frames / rate).toBeCloseTo(2, 1);
  expect(read.typeMatches).toBe(true);
});

test('MP3 is decoded and known to be lossy', async () => {
  room.ffmpeg('-i', 'source.wav', '-ar', '44100', 'a.mp3');
  expect((await decodeWhole(room.read('a.mp3'))).format).toMatchObject({
    container: 'mp3',
    lossy: true,
    sampleRateHz: 44_100,
  });
});

// ITU-T G.711, values recomputed from its algorithm (from memory).
test('mu-law and A-law bytes mean what G.711 says', () => {
  expect([0x00, 0x80, 0xff, 0x7f, 0xe7].map(muLawToLinear)).toEqual(
    [-32124, 32124, 0, -0, 260].map((x) => x + 0),
  );
  expect([0xd5, 0x55, 0xaa, 0x2a].map(aLawToLinear)).toEqual([8, -8, 32256, -32256]);
});

describe('files that lie', () => {
  const wav = () => room.read('16-bit.wav');
  const patched = (at: number, value: number) => {
    const bytes = wav();
    new DataView(bytes.buffer).setUint32(at, value, true);
    return bytes;
  };
  test('a streamed header without sizes is read to its end', async () => {
    const whole = await decodeWhole(wav());
    for (const size of [0, 0xffff_ffff, 0x7fff_f000]) {
      const read = await decodeWhole(patched(40, size));
      expect(read).toMatchObject({ ok: true, frames: whole.frames, missingFrames: 0 });
      expect(read.format?.oddities).toContain('data-size-open');
    }
  });
  test('a cut file says how much is missing', async () => {
    const read = await decodeWhole(wav().slice(0, 44 + 4 * 1000));
    expect(read).toMatchObject({ ok: true, frames: 1000, missingFrames: 15_000 });
  });
  test('a cut FLAC says how much is missing, although its decoder does not', async () => {
    const bytes = room.read('flac-16.flac');
    const read = await decodeWhole(bytes.slice(0, bytes.length / 2));
    expect(read.ok).toBe(true);
    expect(read.missingFrames).toBe(16_000 - read.frames);
    expect(read.missingFrames).toBeGreaterThan(1000);
  });
  test.each([
    ['0 Hz', 24, 0, 'rate-out-of-range'],
    ['4 GHz', 24, 0xffff_ffff, 'rate-out-of-range'],
    ['65,535 channels', 22, 0x1f40_ffff, 'channels-out-of-range'],
    ['an unknown format', 20, 0x0002_7777, 'format-unknown'],
  ])('%s is not readable, and says why', async (_name, at, value, reason) => {
    expect(await decodeWhole(patched(at, value))).toMatchObject({ ok: false, failure: 'unreadable', reason });
  });
  test('a wrong RIFF size, a wrong byte rate and bytes behind the end are irregularities, not faults', async () => {
    expect((await decodeWhole(patched(4, 12))).format?.oddities).toEqual(['riff-size-wrong']);
    expect((await decodeWhole(patched(28, 1))).format?.oddities).toEqual(['byte-rate-wrong']);
    expect((await decodeWhole(new Uint8Array([...wav(), 1, 2, 3]))).format?.oddities).toEqual([
      'riff-size-wrong',
      'trailing-bytes',
    ]);
  });
  test('an odd chunk with or without its pad byte, and sound before its format, are read', async () => {
    const bytes = wav();
    const list = (pad: boolean) =>
      new Uint8Array([
        ...bytes.slice(0, 12),
        ...new TextEncoder().encode('junk'),
        3,
        0,
        0,
        0,
        65,
        66,
        67,
        ...(pad ? [0] : []),
        ...bytes.slice(12),
      ]);
    for (const pad of [true, false])
      expect(await decodeWhole(list(pad))).toMatchObject({ ok: true, frames: 16_000 });
    const turned = new Uint8Array([...bytes.slice(0, 12), ...bytes.slice(36), ...bytes.slice(12, 36)]);
    const read = await decodeWhole(turned);
    expect(read).toMatchObject({ ok: true, frames: 16_000 });
    expect(read.format?.oddities).toContain('data-before-format');
  });
  test('NaN and infinities become silence and are told', async () => {
    const bytes = room.read('float.wav');
    const at = bytes.length - 400;
    new DataView(bytes.buffer).setFloat32(at, Number.NaN, true);
    new DataView(bytes.buffer).setFloat32(at + 4, Number.POSITIVE_INFINITY, true);
    const read = await decodeWhole(bytes);
    expect(read.format?.oddities).toContain('non-finite-samples');
    expect(read.channels.every((channel) => channel.every(Number.isFinite))).toBe(true);
  });
  test.each([
    ['text', 'hello there', 'text'],
    ['a page', '<!doctype html><p>', 'html'],
    ['an archive', 'PK\u0003\u0004', 'archive'],
    ['nothing', '', 'nothing'],
  ])('%s is not sound', async (_name, text, sniffed) => {
    expect(await decodeWhole(new TextEncoder().encode(text))).toMatchObject({
      ok: false,
      failure: 'unreadable',
      sniffed,
    });
  });
});

test('however a file is cut into pieces, it is decoded the same', async () => {
  const bytes = room.read('24-bit.wav').slice(0, 5000);
  const whole = await decodeWhole(bytes);
  await fc.assert(
    fc.asyncProperty(
      fc.array(fc.integer({ min: 1, max: 700 }), { minLength: 1, maxLength: 40 }),
      async (sizes) => {
        const got: number[] = [];
        const decoder = createDecoder({
          onFormat: () => undefined,
          onBlock: (block) => got.push(...(block[0] ?? [])),
        });
        for (let at = 0, i = 0; at < bytes.length; i++) {
          const size = sizes[i % sizes.length] ?? 1;
          await decoder.push(bytes.subarray(at, at + size));
          at += size;
        }
        const end = await decoder.end();
        expect(end.frames).toBe(whole.frames);
        expect(got).toEqual([...(whole.channels[0] ?? [])]);
      },
    ),
    { numRuns: 25 },
  );
});

test('no mutation of a header or of the data makes a decoder throw', async () => {
  const sources = [
    room.read('16-bit.wav').slice(0, 3000),
    room.read('flac-16.flac').slice(0, 6000),
    room.read('opus.ogg').slice(0, 6000),
    room.read('long.wav').slice(0, 3000),
  ];
  await fc.assert(
    fc.asyncProperty(
      fc.integer({ min: 0, max: 3 }),
      fc.array(fc.tuple(fc.nat(2999), fc.nat(255)), { minLength: 1, maxLength: 12 }),
      async (which, changes) => {
        const bytes = (sources[which] ?? new Uint8Array()).slice();
        for (const [at, value] of changes) bytes[at < 200 ? at : at % bytes.length] = value;
        const read = await decodeWhole(bytes);
        expect(read.frames).toBeLessThan(10_000_000);
      },
    ),
    { numRuns: 150 },
  );
});
