import { describe, expect, test } from 'vitest';
import { crc8, crc16 } from '@/lib/acoustics/decode/crc';
import { createDecoder, decodeWhole } from '@/lib/acoustics/decode/decode';
import { bytesOf, chunk, codes16, fmt, plainWav, riff, u32 } from './build';

/** Eight channels of 192 kHz in blocks of 65,535 equal samples: 34 bytes that unpack to half a million (RFC 9639, 9). */
function constantFrame(number: number, trueSum = true): Uint8Array {
  const coded = number < 128 ? [number] : [0xc0 | (number >> 6), 0x80 | (number & 0x3f)];
  const head = bytesOf([0xff, 0xf8, 0x70, 0x70], coded, [0xff, 0xfe]);
  const frame = bytesOf(head, [crc8(head, 0, head.length)], ...Array.from({ length: 8 }, () => [0, 0, 1]));
  const sum = crc16(frame, 0, frame.length) ^ (trueSum ? 0 : 1);
  return bytesOf(frame, [sum >> 8, sum & 0xff]);
}
const flacHead = bytesOf(
  'fLaC',
  [0x80, 0, 0, 34],
  [0xff, 0xff, 0xff, 0xff, 0, 0, 0, 0, 0, 0],
  // 192,000 Hz, 8 channels, 16 bits, no total.
  [0x2e, 0xe0, 0x0e, 0xf0, 0, 0, 0, 0],
  new Uint8Array(16),
);
const frames = (count: number, trueSum = true) =>
  bytesOf(flacHead, ...Array.from({ length: count }, (_, i) => constantFrame(i % 1000, trueSum)));

async function samplesOf(bytes: Uint8Array) {
  let samples = 0;
  const decoder = createDecoder({
    onFormat: () => undefined,
    onBlock: (block) => {
      samples += block.length * (block[0]?.length ?? 0);
    },
  });
  await decoder.push(bytes);
  const result = await decoder.end();
  return { ...result, samples };
}

describe('what unpacks to too much', () => {
  test('a constant frame is sound as long as it is little', async () => {
    const read = await samplesOf(frames(3));
    expect(read).toMatchObject({ ok: true, frames: 3 * 65_535, samples: 3 * 8 * 65_535 });
  });
  test('a small file of thousands of them is refused when it has gone too far', async () => {
    const read = await samplesOf(frames(5000));
    expect(read).toMatchObject({ ok: false, failure: 'refused-limits', reason: 'expands-too-much' });
    expect(read.samples).toBeLessThan(100_000_000);
  });
  test('frames whose checksum is wrong are not decoded for ever', async () => {
    const read = await samplesOf(frames(5000, false));
    expect(read).toMatchObject({ ok: false, failure: 'refused-limits', reason: 'too-damaged', samples: 0 });
  });
  test('a recording longer than the limit is refused', async () => {
    const codes = Array.from({ length: 9000 }, () => 5);
    expect(await decodeWhole(plainWav(codes), undefined, { longestSeconds: 1 })).toMatchObject({
      failure: 'refused-limits',
      reason: 'too-long',
    });
    expect(await decodeWhole(plainWav(codes), undefined, { longestSeconds: 2 })).toMatchObject({ ok: true });
  });
});

test('eight hours at 4 kHz go through in bounded memory', async () => {
  const total = 8 * 3600 * 4000;
  let seen = 0;
  let sum = 0;
  const decoder = createDecoder({
    onFormat: () => undefined,
    onBlock: ([samples]) => {
      seen += samples?.length ?? 0;
      sum += samples?.[0] ?? 0;
    },
  });
  await decoder.push(
    riff([fmt({ rateHz: 4000 }), bytesOf('data', u32(2 * total))], { size: 36 + 2 * total }),
  );
  const piece = codes16(Array.from({ length: 32_000 }, (_, i) => (i % 3000) - 1500));
  globalThis.gc?.();
  const before = process.memoryUsage().rss;
  let most = before;
  for (let at = 0; at < total; at += 32_000) {
    await decoder.push(piece);
    most = Math.max(most, process.memoryUsage().rss);
  }
  const read = await decoder.end();
  expect(read).toMatchObject({ ok: true, frames: total, missingFrames: 0 });
  expect(read.format?.oddities).toEqual([]);
  expect(seen).toBe(total);
  expect(sum).not.toBe(0);
  // The file is 230 MB; holding it, or its samples, would show.
  expect((most - before) / 2 ** 20).toBeLessThan(100);
});

test('nothing is allocated by a size that a header declares', async () => {
  const declared = 0xffff_fff0;
  const before = process.memoryUsage().arrayBuffers;
  for (const file of [
    riff([chunk('fmt ', [], { size: declared })]),
    riff([fmt(), chunk('data', [1, 0], { size: 0xf000_0000 })]),
    riff([chunk('ds64', [], { size: declared })], { magic: 'RF64' }),
    bytesOf('fLaC', [0x00, 0xff, 0xff, 0xff]),
    bytesOf('ID3', [4, 0, 0, 0x7f, 0x7f, 0x7f, 0x7f], new Uint8Array(100)),
  ])
    expect((await decodeWhole(file)).frames).toBeLessThan(2);
  expect((process.memoryUsage().arrayBuffers - before) / 2 ** 20).toBeLessThan(16);
});
