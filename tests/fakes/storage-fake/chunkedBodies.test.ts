import { describe, expect, test } from 'vitest';
import { decodeChunked } from '@/storage-fake/chunked';

/** Pieces of `size` bytes, as a socket might cut them. */
async function* cut(text: string, size: number): AsyncGenerator<Buffer> {
  const bytes = Buffer.from(text, 'latin1');
  for (let at = 0; at < bytes.length; at += size) yield bytes.subarray(at, at + size);
}

async function decode(text: string, options: { trailer: boolean; decodedBytes: number }, size = 1000) {
  const decoder = decodeChunked(cut(text, size), options);
  let out = '';
  for (;;) {
    const next = await decoder.next();
    if (next.done) return { out, trailers: Object.fromEntries(next.value) };
    out += next.value.toString('latin1');
  }
}

const GOOD = '5\r\nhello\r\n6\r\n world\r\n0\r\nx-amz-checksum-crc32:DUoRhQ==\r\n\r\n';

describe('an unsigned chunked body', () => {
  test.each([1, 2, 3, 7, 1000])('is read the same when it comes in pieces of %d bytes', async (size) => {
    const { out, trailers } = await decode(GOOD, { trailer: true, decodedBytes: 11 }, size);
    expect(out).toBe('hello world');
    expect(trailers).toEqual({ 'x-amz-checksum-crc32': 'DUoRhQ==' });
  });

  test.each([
    ['a length that was declared otherwise', GOOD, 12, 'IncompleteBody'],
    ['more than was declared', GOOD, 10, 'IncompleteBody'],
    ['an end in the middle of a chunk', GOOD.slice(0, 6), 11, 'IncompleteBody'],
    ['an end before the last chunk', GOOD.slice(0, 21), 11, 'IncompleteBody'],
    ['an end before the empty line', GOOD.slice(0, -2), 11, 'IncompleteBody'],
    ['bytes behind the end', `${GOOD}x`, 11, 'IncompleteBody'],
    ['a size that is no number', GOOD.replace('5', 'z'), 11, 'IncompleteBody'],
    ['a size that is too long to be one', `${'f'.repeat(13)}\r\n`, 11, 'IncompleteBody'],
    ['a chunk without its line end', GOOD.replace('hello\r\n', 'hello..'), 11, 'IncompleteBody'],
    ['a trailer that is no header', GOOD.replace('crc32:', 'crc32 '), 11, 'MalformedTrailerError'],
    ['a line without end', 'x'.repeat(20_000), 11, 'IncompleteBody'],
  ])('is refused for %s', async (_, text, decodedBytes, code) => {
    await expect(decode(text, { trailer: true, decodedBytes })).rejects.toMatchObject({ code });
  });

  test('is refused for trailers that were not announced', async () => {
    await expect(decode(GOOD, { trailer: false, decodedBytes: 11 })).rejects.toMatchObject({
      code: 'MalformedTrailerError',
    });
  });
});
