import {
  DeleteObjectCommand,
  ListObjectsCommand,
  ListObjectsV2Command,
  ListObjectVersionsCommand,
  PutObjectCommand,
  type S3Client,
} from '@aws-sdk/client-s3';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { KeyIndex } from '@/storage-fake/keyIndex';
import { listKeys } from '@/storage-fake/listing';
import { BUCKET, clientFor, codeOf, fakeForTest } from './support';

const bytewise = (a: string, b: string): number => Buffer.compare(Buffer.from(a), Buffer.from(b));

/** What a listing should hold, said the slow way. */
function naive(keys: string[], prefix: string, delimiter: string): string[] {
  const entries = new Set<string>();
  for (const key of [...keys].sort(bytewise)) {
    if (!key.startsWith(prefix)) continue;
    const cut = delimiter === '' ? -1 : key.indexOf(delimiter, prefix.length);
    entries.add(cut < 0 ? `key ${key}` : `prefix ${key.slice(0, cut + delimiter.length)}`);
  }
  return [...entries];
}

const shown = (entry: { key: string } | { commonPrefix: string }): string =>
  'key' in entry ? `key ${entry.key}` : `prefix ${entry.commonPrefix}`;

/** Letters that meet often, with a pair of surrogates and a character above U+E000, where UTF-16 order is another. */
const text = fc
  .array(fc.constantFrom('a', 'b', '/', 'ü', '\u{1f3b5}', '\uff5e'), { maxLength: 6 })
  .map((parts) => parts.join(''));
const key = text.filter((one) => one !== '');

describe('a listing', () => {
  test('is in the order of UTF-8 bytes and, page by page, the whole', () => {
    const property = fc.property(
      fc.uniqueArray(key, { maxLength: 30 }),
      text,
      fc.constantFrom('', '/', 'b'),
      fc.integer({ min: 1, max: 5 }),
      (keys, prefix, delimiter, limit) => {
        const index = new KeyIndex<string>();
        for (const one of keys) index.set(one, one);
        const all: string[] = [];
        for (let after = '', truncated = true; truncated; ) {
          const page = listKeys(index, { prefix, delimiter, after, limit });
          expect(page.entries.length).toBeLessThanOrEqual(limit);
          all.push(...page.entries.map(shown));
          ({ truncated } = page);
          after = page.last ?? '';
        }
        expect(all).toEqual(naive(keys, prefix, delimiter));
      },
    );
    fc.assert(property, { numRuns: 500 });
  });

  test('stays in order while keys come and go', () => {
    const property = fc.property(fc.array(fc.tuple(fc.boolean(), key), { maxLength: 60 }), (steps) => {
      const index = new KeyIndex<number>();
      const model = new Set<string>();
      for (const [put, one] of steps) {
        if (put) {
          index.set(one, 1);
          model.add(one);
        } else {
          index.delete(one);
          model.delete(one);
        }
      }
      const listed = listKeys(index, { prefix: '', delimiter: '', after: '', limit: 1000 });
      expect(listed.entries.map(shown)).toEqual([...model].sort(bytewise).map((one) => `key ${one}`));
    });
    fc.assert(property);
  });
});

async function fill(client: S3Client, keys: string[]): Promise<void> {
  for (const Key of keys) await client.send(new PutObjectCommand({ Bucket: BUCKET, Key, Body: Key }));
}

const KEYS = ['a/1', 'a/2', 'b', 'c/x/1', 'c/y', 'd e+f', 'ünïcode', '\u{1f3b5}'];

test('the second form pages by token, the first by marker, and both show the same', async () => {
  const client = clientFor(await fakeForTest());
  await fill(client, KEYS);
  const second: string[] = [];
  for (let ContinuationToken: string | undefined; ; ) {
    const page = await client.send(
      new ListObjectsV2Command({ Bucket: BUCKET, Delimiter: '/', MaxKeys: 2, ContinuationToken }),
    );
    expect(page.KeyCount).toBe((page.Contents?.length ?? 0) + (page.CommonPrefixes?.length ?? 0));
    second.push(
      ...(page.Contents ?? []).map(({ Key }) => Key as string),
      ...(page.CommonPrefixes ?? []).map(({ Prefix }) => Prefix as string),
    );
    ContinuationToken = page.NextContinuationToken;
    if (!page.IsTruncated) break;
  }
  const first: string[] = [];
  for (let Marker: string | undefined; ; ) {
    const page = await client.send(
      new ListObjectsCommand({ Bucket: BUCKET, Delimiter: '/', MaxKeys: 2, Marker }),
    );
    first.push(
      ...(page.Contents ?? []).map(({ Key }) => Key as string),
      ...(page.CommonPrefixes ?? []).map(({ Prefix }) => Prefix as string),
    );
    Marker = page.NextMarker;
    if (!page.IsTruncated) break;
  }
  expect(second.sort(bytewise)).toEqual(['a/', 'b', 'c/', 'd e+f', 'ünïcode', '\u{1f3b5}']);
  expect(first.sort(bytewise)).toEqual(second);
});

test('start-after and prefix cut the listing, max-keys=0 empties it', async () => {
  const client = clientFor(await fakeForTest());
  await fill(client, KEYS);
  const list = async (query: object) => {
    const page = await client.send(new ListObjectsV2Command({ Bucket: BUCKET, ...query }));
    return [page.Contents?.map(({ Key }) => Key) ?? [], page.IsTruncated];
  };
  expect(await list({ StartAfter: 'c/x/1' })).toEqual([KEYS.slice(4), false]);
  expect(await list({ Prefix: 'c/' })).toEqual([['c/x/1', 'c/y'], false]);
  expect(await list({ MaxKeys: 0 })).toEqual([[], false]);
  expect(
    await codeOf(client.send(new ListObjectsV2Command({ Bucket: BUCKET, ContinuationToken: '!' }))),
  ).toBe('InvalidArgument');
});

test('keys that XML has no characters for come through when they are asked for encoded', async () => {
  const client = clientFor(await fakeForTest());
  const odd = ['line\nfeed', 'bell\u0007', 'plus+ and space', '%41'];
  await fill(client, odd);
  const page = await client.send(new ListObjectsV2Command({ Bucket: BUCKET, EncodingType: 'url' }));
  const keys = page.Contents?.map(({ Key }) => decodeURIComponent(Key as string));
  expect(keys?.sort(bytewise)).toEqual([...odd].sort(bytewise));
});

test('every object has one version, and removing it by that name removes it', async () => {
  const client = clientFor(await fakeForTest());
  await fill(client, ['k']);
  const versions = await client.send(new ListObjectVersionsCommand({ Bucket: BUCKET }));
  expect(versions.Versions?.map(({ Key, VersionId, IsLatest }) => [Key, VersionId, IsLatest])).toEqual([
    ['k', 'null', true],
  ]);
  const remove = (VersionId: string) =>
    codeOf(client.send(new DeleteObjectCommand({ Bucket: BUCKET, Key: 'k', VersionId })));
  expect(await remove('v1')).toBe('NoSuchVersion');
  expect(await remove('null')).toBeUndefined();
  expect((await client.send(new ListObjectsV2Command({ Bucket: BUCKET }))).KeyCount).toBe(0);
});
