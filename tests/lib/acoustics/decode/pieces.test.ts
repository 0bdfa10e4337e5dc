import fc from 'fast-check';
import { beforeAll, describe, expect, test } from 'vitest';
import { BLOCK_FRAMES } from '@/lib/acoustics/decode/blocks';
import { type Sample, soundCorpus } from '../../../fuzz/corpus';
import { chunk, codes16, fmt, inPieces, type Pieced, plainWav, riff } from './build';

let corpus: Sample[];
beforeAll(() => {
  corpus = soundCorpus();
});

const told = ({ channels, ...rest }: Pieced) => ({ ...rest, sums: channels.map(fingerprint) });
/** Differs when any sample does. */
const fingerprint = (channel: readonly number[]): string => {
  const bits = new Uint32Array(Float32Array.from(channel).buffer);
  return `${channel.length}:${bits.reduce((sum, word) => (Math.imul(sum, 31) + word) >>> 0, 7)}`;
};

test('a file gives the same sound, format, blocks and verdict however it is cut into pieces', async () => {
  for (const { name, bytes } of corpus) {
    const whole = told(await inPieces(bytes, [bytes.length]));
    for (const sizes of [[1], [2], [7, 13, 1009], [44, 1, 65_536]])
      expect(told(await inPieces(bytes, sizes)), `${name} in ${sizes}`).toEqual(whole);
  }
});

test('that holds for pieces of any size, and for files that were cut anywhere', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc.nat(100),
      fc.double({ min: 0, max: 1, noNaN: true }),
      fc.array(fc.integer({ min: 1, max: 3000 }), { minLength: 1, maxLength: 20 }),
      async (which, share, sizes) => {
        const { bytes } = corpus[which % corpus.length] as Sample;
        const cut = bytes.slice(0, Math.ceil(bytes.length * share));
        expect(told(await inPieces(cut, sizes))).toEqual(told(await inPieces(cut, [cut.length])));
      },
    ),
    { numRuns: 60, seed: 20_260_101 },
  );
});

describe('blocks', () => {
  const codes = Array.from({ length: 2 * BLOCK_FRAMES + 100 }, (_, i) => (i % 5000) - 2500);
  test('are full but for the last', async () => {
    for (const sizes of [[1_000_000], [777], [3, 5, 7]]) {
      const read = await inPieces(plainWav(codes), sizes);
      expect(read.blockLengths).toEqual([BLOCK_FRAMES, BLOCK_FRAMES, 100]);
      expect(read.channels[0]?.every((x, i) => x * 32_768 === codes[i])).toBe(true);
    }
  });
  test('come after the format, which is told once, with its oddities at the end', async () => {
    const read = await inPieces(riff([fmt({ byteRate: 3 }), chunk('data', codes16(codes))]), [500]);
    expect(read.formats).toHaveLength(1);
    expect(read.formats[0]).toMatchObject({ sampleRateHz: 8000, declaredFrames: codes.length, oddities: [] });
    expect(read.format?.oddities).toEqual(['byte-rate-wrong']);
  });
});

test('what the caller throws goes through, and is not taken for a fault of the file', async () => {
  for (const { bytes } of corpus.filter(({ name }) => !name.startsWith('not.'))) {
    const onBlock = () => {
      throw new RangeError('the disk is full');
    };
    await expect(inPieces(bytes, [bytes.length], { onBlock })).rejects.toThrow('the disk is full');
  }
});
