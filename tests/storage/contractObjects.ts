import { randomBytes, randomUUID } from 'node:crypto';
import {
  AbortMultipartUploadCommand,
  CompleteMultipartUploadCommand,
  CreateMultipartUploadCommand,
  HeadObjectCommand,
  PutObjectCommand,
  UploadPartCommand,
} from '@aws-sdk/client-s3';
import { describe, expect, test } from 'vitest';
import { collect, type StoreUnderTest, sha256, writersFor } from './storeUnderTest';

export function describeObjects(name: string, get: () => StoreUnderTest): void {
  const { key, store } = writersFor(get);

  describe(`${name}: an object`, () => {
    test('comes back as it was put, whole and in ranges', async () => {
      const at = key();
      expect(await store(at, '0123456789')).toMatchObject({ outcome: 'stored' });
      const whole = await get().storage.getStream(at);
      expect([String(await collect(whole.body)), whole.contentLength, whole.contentType]).toEqual([
        '0123456789',
        10,
        'audio/wav',
      ]);
      const part = await get().storage.getStream(at, { from: 3, to: 5 });
      expect([String(await collect(part.body)), part.contentLength]).toEqual(['345', 3]);
      const tail = await get().storage.getStream(at, { from: 8 });
      expect(String(await collect(tail.body))).toBe('89');
      expect((await get().storage.head(at))?.etag).toBe(whole.etag);
    });

    test('may be empty', async () => {
      const at = key();
      await store(at, '');
      expect((await get().storage.head(at))?.contentLength).toBe(0);
      expect(await get().storage.getBytes(at, 0)).toHaveLength(0);
    });

    test('is not read where it is longer than the reader allows', async () => {
      const at = key();
      await store(at, '0123456789');
      await expect(get().storage.getBytes(at, 9)).rejects.toMatchObject({ code: 'bad-response' });
      expect(await get().storage.getBytes(at, 10)).toHaveLength(10);
    });

    test('that is not there is null, not found, or nothing to remove', async () => {
      const at = key();
      expect(await get().storage.head(at)).toBeNull();
      await expect(get().storage.getStream(at)).rejects.toMatchObject({ code: 'not-found' });
      await expect(get().storage.getBytes(at, 1)).rejects.toMatchObject({ code: 'not-found' });
      await expect(get().storage.remove(at)).resolves.toBeUndefined();
    });

    test('is put only once where that is asked for', async () => {
      const at = key();
      expect(await store(at, 'first', { ifAbsent: true })).toMatchObject({ outcome: 'stored' });
      expect(await store(at, 'second', { ifAbsent: true })).toMatchObject({ outcome: 'exists' });
      expect(String(await get().storage.getBytes(at, 100))).toBe('first');
    });

    test('is put only once, also by ten at a time', async ({ annotate }) => {
      const at = key();
      if (!get().capabilities.conditionalPut) {
        return annotate(
          'this store does not keep conditional writes: of two at once the last wins',
          'warning',
        );
      }
      const outcomes = await Promise.all(
        Array.from({ length: 10 }, (_, i) => store(at, `writer ${i}`, { ifAbsent: true })),
      );
      const stored = outcomes.flatMap(({ outcome }, i) => (outcome === 'stored' ? [i] : []));
      expect(stored).toHaveLength(1);
      expect(String(await get().storage.getBytes(at, 100))).toBe(`writer ${stored[0]}`);
    });

    test.each(['with space & plus+.wav', 'ünïcode/日本語/\u{1f3b5}', '%41%2F%20', 'quote\'"<xml>;=,@:$!*()'])(
      'can be called %j',
      async (part) => {
        const at = key(part);
        await store(at, 'here');
        expect(String(await get().storage.getBytes(at, 10))).toBe('here');
        const page = await get().storage.list(at);
        expect(page.entries.map((entry) => entry.key)).toEqual([at]);
        await get().storage.remove(at);
        expect(await get().storage.head(at)).toBeNull();
      },
    );
  });

  describe(`${name}: a listing`, () => {
    test('goes through all keys page by page, in order, and not beyond its prefix', async () => {
      const under = `${get().prefix}${randomUUID()}/`;
      const keys = ['a', 'b/1', 'b/2', 'c d', 'ü'].map((part) => under + part);
      for (const at of [...keys, `${under.slice(0, -1)}0`]) await store(at, at);
      const seen: string[] = [];
      for (let after: string | undefined; ; ) {
        const page = await get().storage.list(under, { limit: 2, ...(after === undefined ? {} : { after }) });
        expect(page.entries.length).toBeLessThanOrEqual(2);
        seen.push(...page.entries.map((entry) => entry.key));
        if (page.next === undefined) break;
        after = page.next;
      }
      expect(seen).toEqual(keys);
    });
  });

  describe(`${name}: an upload in parts`, () => {
    test('becomes one object whose tag the port gives as the store does', async () => {
      const { client, bucket, storage } = get();
      const at = { Bucket: bucket, Key: key('long.wav') };
      const { UploadId } = await client.send(new CreateMultipartUploadCommand(at));
      const bodies = [randomBytes(5 * 1024 * 1024), randomBytes(1000)];
      const Parts = await Promise.all(
        bodies.map(async (Body, i) => {
          const { ETag } = await client.send(
            new UploadPartCommand({ ...at, UploadId, PartNumber: i + 1, Body }),
          );
          return { ETag, PartNumber: i + 1 };
        }),
      );
      await client.send(new CompleteMultipartUploadCommand({ ...at, UploadId, MultipartUpload: { Parts } }));
      const head = await storage.head(at.Key);
      expect(`"${head?.etag}"`).toBe((await client.send(new HeadObjectCommand(at))).ETag);
      const whole = Buffer.concat(bodies);
      expect(Buffer.from(await storage.getBytes(at.Key, whole.length)).equals(whole)).toBe(true);
      // Its copy is in one part and has another tag: the bytes decide.
      const sealed = await storage.seal({
        from: at.Key,
        to: key('original'),
        retainUntilMs: 0,
        contentType: 'audio/wav',
        expectedEtag: head?.etag as string,
        contentLength: head?.contentLength as number,
        sha256: sha256(whole),
      });
      expect(sealed.outcome).toBe('sealed');
    });

    test('that is broken off leaves no object', async () => {
      const { client, bucket, storage } = get();
      const at = { Bucket: bucket, Key: key('long.wav') };
      const { UploadId } = await client.send(new CreateMultipartUploadCommand(at));
      await client.send(new UploadPartCommand({ ...at, UploadId, PartNumber: 1, Body: 'x' }));
      await client.send(new AbortMultipartUploadCommand({ ...at, UploadId }));
      expect(await storage.head(at.Key)).toBeNull();
    });
  });

  describe(`${name}: the check`, () => {
    test('does it all for real, and leaves nothing behind', async () => {
      const under = `${get().prefix}${randomUUID()}/`;
      const report = await get().storage.check(under);
      const { conditionalPut, objectLock } = get().capabilities;
      const failed = report.steps.filter(({ ok }) => !ok).map((step) => step.name);
      expect(failed).toEqual(conditionalPut ? [] : ['refuse to overwrite']);
      expect([report.ok, report.objectLock]).toEqual([conditionalPut, objectLock]);
      expect((await get().storage.list(under)).entries).toEqual([]);
    });
  });

  describe(`${name}: another client of the store`, () => {
    test('sees what Bellkeep wrote, and Bellkeep what it wrote', async () => {
      const at = key();
      await get().client.send(
        new PutObjectCommand({ Bucket: get().bucket, Key: at, Body: 'theirs', ContentType: 'text/plain' }),
      );
      const opened = await get().storage.getStream(at);
      expect([String(await collect(opened.body)), opened.contentType]).toEqual(['theirs', 'text/plain']);
    });
  });
}
