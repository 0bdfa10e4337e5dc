import { describe, expect, test } from 'vitest';
import { decodeWhole } from '@/lib/acoustics/decode/decode';
import { bytesOf, chunk, codes16, extension, fmt, inPieces, plainWav, riff, u16, u32, u64 } from './build';

const CODES = Array.from({ length: 1000 }, (_, i) => ((i * 37) % 2000) - 1000);
const DATA = codes16(CODES);
const patched = (file: Uint8Array, at: number, value: number): Uint8Array => {
  const copy = file.slice();
  new DataView(copy.buffer).setUint32(at, value, true);
  return copy;
};
const PLAIN = plainWav(CODES);
const sound = async (file: Uint8Array) => {
  const read = await decodeWhole(file);
  return { ...read, codes: [...(read.channels[0] ?? [])].map((x) => x * 32_768) };
};

describe('sizes that lie', () => {
  test.each([0, 0xffff_ffff, 0xffff_fff8, 0x7fff_f000, 0x7fff_ffff])(
    'a data size of %i that was left open means to the end',
    async (size) => {
      for (const riffSize of [36, 0, 0xffff_ffff, PLAIN.length - 8]) {
        const read = await sound(patched(patched(PLAIN, 40, size), 4, riffSize));
        expect(read).toMatchObject({
          ok: true,
          frames: 1000,
          declaredFrames: null,
          missingFrames: 0,
          codes: CODES,
        });
        expect(read.format?.oddities).toContain('data-size-open');
      }
    },
  );
  test('a data size of 0 that is meant leaves no sound, though chunks follow', async () => {
    const read = await decodeWhole(
      riff([fmt(), chunk('data', []), chunk('LIST', bytesOf('INFOISFT', u32(4), 'Abcd'))]),
    );
    expect(read).toMatchObject({ ok: false, failure: 'empty', reason: 'no-samples', frames: 0 });
    expect(read.format?.oddities).toEqual([]);
  });
  test('a whole file of just over 2 GiB less 64 KiB is not taken for one whose size was left open', async () => {
    const size = 0x7fff_0002;
    const read = await inPieces(patched(PLAIN, 40, size), [5000], { totalBytes: 44 + size });
    expect(read.declaredFrames).toBe(size / 2);
    expect(read.missingFrames).toBe(size / 2 - 1000);
    expect(read.format?.oddities).not.toContain('data-size-open');
  });
  test('a file that was cut is read as far as it goes, and what is missing is counted', async () => {
    const read = await sound(PLAIN.slice(0, 44 + 2 * 400));
    expect(read).toMatchObject({ ok: true, frames: 400, declaredFrames: 1000, missingFrames: 600 });
    expect(read.codes).toEqual(CODES.slice(0, 400));
    expect(read.format?.oddities).toEqual([]);
  });
  test('a file that was cut right behind its header is empty, and all of it is missing', async () => {
    expect(await decodeWhole(PLAIN.slice(0, 44))).toMatchObject({
      failure: 'empty',
      reason: 'data-missing',
      missingFrames: 1000,
    });
  });
  test('a frame of which only a part is there is left out', async () => {
    const stereo = riff([fmt({ channels: 2 }), chunk('data', DATA.subarray(0, 4 * 100 + 3), { pad: [] })]);
    const read = await decodeWhole(stereo);
    expect(read).toMatchObject({ ok: true, frames: 100 });
    expect(read.format?.oddities).toContain('partial-frame');
  });
  test('refuse behind the sound is named and not heard', async () => {
    const read = await sound(bytesOf(PLAIN, [1, 2, 3, 4, 5, 6, 7, 8, 9, 10]));
    expect(read).toMatchObject({ ok: true, frames: 1000, codes: CODES });
    expect(read.format?.oddities).toEqual(['riff-size-wrong', 'trailing-bytes']);
  });
  test.each([
    [0, 'riff-size-wrong'],
    [12, 'riff-size-wrong'],
    [0xffff_ffff, 'riff-size-wrong'],
  ])('a RIFF size of %i does no harm', async (size, oddity) => {
    const read = await sound(patched(PLAIN, 4, size));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toEqual([oddity]);
  });
  test('a chunk that claims the rest of the world hides what follows, and nothing is allocated for it', async () => {
    const read = await decodeWhole(
      riff([fmt(), chunk('LIST', [1, 2, 3, 4], { size: 0xffff_fff0 }), chunk('data', DATA)]),
    );
    expect(read).toMatchObject({ ok: false, failure: 'empty', reason: 'no-data' });
  });
});

describe('a format that lies', () => {
  test.each([
    [{ byteRate: 1 }, ['byte-rate-wrong']],
    [{ blockAlign: 7 }, ['block-align-wrong']],
    [{ byteRate: 0, blockAlign: 0 }, ['block-align-wrong', 'byte-rate-wrong']],
  ])('channels and bits are believed before %j', async (lie, oddities) => {
    const read = await sound(riff([fmt(lie), chunk('data', DATA)]));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toEqual(oddities);
  });
  test.each([
    ['0 Hz', { rateHz: 0 }, 'rate-out-of-range'],
    ['499 Hz', { rateHz: 499 }, 'rate-out-of-range'],
    ['192,001 Hz', { rateHz: 192_001 }, 'rate-out-of-range'],
    ['4 GHz', { rateHz: 0xffff_ffff }, 'rate-out-of-range'],
    ['no channel', { channels: 0 }, 'channels-out-of-range'],
    ['9 channels', { channels: 9 }, 'channels-out-of-range'],
    ['65,535 channels', { channels: 65_535 }, 'channels-out-of-range'],
    ['0 bits', { bits: 0 }, 'bit-depth-unknown'],
    ['40 bits', { bits: 40 }, 'bit-depth-unknown'],
    ['65,535 bits', { bits: 65_535 }, 'bit-depth-unknown'],
    ['a float of 16 bits', { tag: 3 }, 'bit-depth-unknown'],
    ['ADPCM', { tag: 2, bits: 4 }, 'format-unknown'],
    ['MP3 in WAV', { tag: 0x55 }, 'format-unknown'],
    ['an extensible format without its extension', { tag: 0xfffe }, 'format-short'],
    [
      'a sub-format of another maker',
      { tag: 0xfffe, more: extension(16, 1, [1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14]) },
      'format-unknown',
    ],
  ])('%s is unreadable, and says why', async (_name, lie, reason) => {
    expect(await decodeWhole(riff([fmt(lie), chunk('data', DATA)]))).toMatchObject({
      ok: false,
      failure: 'unreadable',
      reason,
      frames: 0,
    });
  });
  test.each([500, 192_000])('%i Hz is the edge of what is read', async (rateHz) => {
    expect(await decodeWhole(riff([fmt({ rateHz }), chunk('data', DATA)]))).toMatchObject({
      ok: true,
      frames: 1000,
    });
  });
  test('more valid bits than there are is an irregularity', async () => {
    const lie = { tag: 0xfffe, more: extension(24, 1) };
    const read = await sound(riff([fmt(lie), chunk('data', DATA)]));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format).toMatchObject({ bitDepth: 16, oddities: ['valid-bits-wrong'] });
  });
  test('a format chunk too short to be one is unreadable', async () => {
    expect(await decodeWhole(riff([chunk('fmt ', [1, 0, 1, 0]), chunk('data', DATA)]))).toMatchObject({
      reason: 'format-short',
    });
  });
});

describe('RF64', () => {
  const ds64 = (riffSize: number, dataSize: number, samples: number) =>
    chunk('ds64', bytesOf(u64(riffSize), u64(dataSize), u64(samples), u32(0)));
  const file = (head: Uint8Array, magic = 'RF64') =>
    riff([head, fmt(), chunk('data', DATA, { size: 0xffff_ffff })], { magic, size: 0xffff_ffff });
  const size = file(ds64(0, 0, 0)).length - 8;

  test.each(['RF64', 'BW64'])('%s takes its sizes from ds64', async (magic) => {
    const read = await sound(file(ds64(size, 2000, 1000), magic));
    expect(read).toMatchObject({
      ok: true,
      codes: CODES,
      declaredFrames: 1000,
      sniffed: magic.toLowerCase(),
    });
    expect(read.format).toMatchObject({ container: magic.toLowerCase(), oddities: [] });
  });
  test('more than four billion bytes may be declared, and what is missing of them is counted', async () => {
    const read = await sound(file(ds64(2 ** 40, 2 ** 40, 2 ** 39)));
    expect(read).toMatchObject({ frames: 1000, declaredFrames: 2 ** 39, missingFrames: 2 ** 39 - 1000 });
  });
  test.each([0, 2 ** 64 - 2 ** 11])('a 64-bit size of %i was left open', async (dataSize) => {
    const read = await sound(file(ds64(size, dataSize, 0)));
    expect(read).toMatchObject({ ok: true, codes: CODES, declaredFrames: null, missingFrames: 0 });
  });
  test('a wrong count of samples and a missing ds64 are irregularities', async () => {
    expect((await sound(file(ds64(size, 2000, 999)))).format?.oddities).toEqual(['sample-count-wrong']);
    expect((await sound(file(chunk('JUNK', new Uint8Array(28))))).codes).toEqual(CODES);
  });
  test('a ds64 too short to hold its sizes is unreadable', async () => {
    expect(await decodeWhole(file(chunk('ds64', [1, 2, 3, 4])))).toMatchObject({ reason: 'ds64-short' });
  });
});

describe('chunks', () => {
  const list = chunk('LIST', bytesOf('INFOISFT', u32(6), 'Abcdef'));
  test.each([
    ['before the format', [list, fmt(), chunk('fact', u32(1000)), chunk('data', DATA)]],
    ['behind the sound', [fmt(), chunk('data', DATA), list, chunk('id3 ', [1, 2, 3])]],
    [
      'all over',
      [
        chunk('JUNK', new Uint8Array(61)),
        chunk('bext', new Uint8Array(603)),
        fmt(),
        list,
        chunk('data', DATA),
        list,
      ],
    ],
  ])('others may stand %s', async (_name, chunks) => {
    const read = await sound(riff(chunks));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toEqual([]);
  });
  test('sound before its format is kept until the format comes', async () => {
    const read = await sound(riff([chunk('data', DATA), fmt()]));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toEqual(['chunk-order-odd', 'data-before-format']);
  });
  test('sound without any format is not kept for ever', async () => {
    const head = riff([chunk('data', [], { size: 0xffff_ffff })]);
    const decoder = await inPieces(bytesOf(head, new Uint8Array(17 << 20)), [1 << 20]);
    expect(decoder).toMatchObject({ failure: 'unreadable', reason: 'no-format', frames: 0 });
  });
  test.each([
    ['a known chunk', chunk('LIST', [1, 2, 3], { pad: [] })],
    ['an unknown chunk', chunk('wxyz', [1, 2, 3], { pad: [] })],
  ])('a pad byte that was forgotten behind %s is missed and forgiven', async (_name, odd) => {
    const read = await sound(riff([odd, fmt(), chunk('data', DATA)]));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toContain('pad-byte-missing');
  });
  test('a pad byte that is a letter is still a pad byte', async () => {
    const read = await sound(riff([chunk('LIST', [1, 2, 3], { pad: [0x41] }), fmt(), chunk('data', DATA)]));
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format?.oddities).toEqual([]);
  });
  test('an odd number of 8-bit samples ends well with its pad byte, and without', async () => {
    const eight = (pad: number[]) => riff([fmt({ bits: 8 }), chunk('data', [0, 128, 255], { pad })]);
    const padded = await decodeWhole(eight([0]));
    expect([...(padded.channels[0] ?? [])]).toEqual([-1, 0, 127 / 128]);
    expect(padded.format?.oddities).toEqual([]);
    const bare = await decodeWhole(eight([]));
    expect(bare).toMatchObject({ frames: 3 });
    expect(bare.format?.oddities).toEqual(['pad-byte-missing']);
  });
  test('of several sounds and formats the first ones count', async () => {
    const read = await sound(
      riff([fmt(), fmt({ rateHz: 16_000 }), chunk('data', DATA), chunk('data', codes16([1, 2]))]),
    );
    expect(read).toMatchObject({ ok: true, codes: CODES });
    expect(read.format).toMatchObject({ sampleRateHz: 8000, oddities: ['data-twice', 'format-twice'] });
  });
  test('many thousands of tiny chunks are passed over', async () => {
    const tiny = Array.from({ length: 20_000 }, (_, i) => chunk('note', i % 3 === 0 ? [] : [i & 0xff]));
    expect(await sound(riff([...tiny, fmt(), chunk('data', DATA)]))).toMatchObject({
      ok: true,
      codes: CODES,
    });
  });
  test('noise behind a RIFF head is given up', async () => {
    const noise = Uint8Array.from({ length: 4000 }, (_, i) => (i % 8 < 4 ? 1 : 0));
    expect(await decodeWhole(riff([noise]))).toMatchObject({
      failure: 'unreadable',
      reason: 'chunks-senseless',
    });
  });
  test('a page that is also a recording is a recording', async () => {
    const page = chunk('JUNK', bytesOf('<!doctype html><script>alert(1)</script>'));
    expect(await sound(riff([page, fmt(), chunk('data', DATA)]))).toMatchObject({
      ok: true,
      sniffed: 'wav',
      codes: CODES,
    });
  });
  test('a mu-law file that claims 16 bits is read as the bytes it holds', async () => {
    const read = await decodeWhole(
      riff([fmt({ tag: 7, blockAlign: 1, byteRate: 8000 }), chunk('data', [0x80, 0x00])]),
    );
    expect([...(read.channels[0] ?? [])]).toEqual([32_124 / 32_768, -32_124 / 32_768]);
    expect(read.format).toMatchObject({ bitDepth: 8, oddities: ['bits-wrong'] });
  });
});

test('a header of every length short of whole is unreadable or empty, and never throws', async () => {
  for (let length = 1; length <= 44; length++) {
    const read = await decodeWhole(PLAIN.slice(0, length));
    expect(read.ok).toBe(false);
    expect(read.reason).not.toBe('');
  }
  expect(await decodeWhole(bytesOf(u16(0)))).toMatchObject({ failure: 'unreadable', sniffed: 'unknown' });
});
