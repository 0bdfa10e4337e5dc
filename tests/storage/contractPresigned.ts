import { randomBytes } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import { putBy, type StoreUnderTest, sha256, writersFor } from './storeUnderTest';

export function describePresigned(name: string, get: () => StoreUnderTest): void {
  const { key, store } = writersFor(get);

  describe(`${name}: a presigned upload`, () => {
    const body = randomBytes(4096);
    const presign = (at: string, more: object = {}) =>
      get().storage.presignPut({
        key: at,
        contentLength: body.length,
        contentType: 'audio/wav',
        sha256: sha256(body),
        expiresSeconds: 60,
        ...more,
      });

    test('admits exactly the bytes it was made for', async () => {
      const at = key('clip one.wav');
      expect(await putBy(await presign(at), body)).toBe(200);
      const head = await get().storage.head(at);
      expect([head?.contentLength, head?.contentType]).toEqual([body.length, 'audio/wav']);
      expect(Buffer.from(await get().storage.getBytes(at, body.length)).equals(body)).toBe(true);
    });

    test('refuses another type and another length, and nothing of them stays', async () => {
      const at = key();
      const presigned = await presign(at);
      expect(await putBy(presigned, body, { 'content-type': 'text/html' })).toBe(403);
      expect(await putBy(presigned, body.subarray(1))).toBe(403);
      expect(await putBy(presigned, Buffer.concat([body, body]))).toBe(403);
      expect(
        await putBy(presigned, body, {
          'x-amz-checksum-sha256': sha256(Buffer.from('x')).toString('base64'),
        }),
      ).toBe(403);
      expect(await get().storage.head(at)).toBeNull();
    });

    test('refuses other bytes of the same length, where the store looks at them', async ({ annotate }) => {
      const at = key();
      const status = await putBy(await presign(at), randomBytes(body.length));
      if (get().capabilities.verifiesSignedSha256) {
        expect(status).toBe(400);
        expect(await get().storage.head(at)).toBeNull();
      } else {
        // Reported, not passed over: then the hash taken at ingestion is the only guard.
        await annotate('this store does not verify a signed SHA-256', 'warning');
        expect(Buffer.from(await get().storage.getBytes(at, body.length)).equals(body)).toBe(false);
      }
    });

    test('opens no other key', async () => {
      const [at, other] = [key('a'), key('b')];
      const presigned = await presign(at);
      const url = new URL(presigned.url);
      url.pathname = url.pathname.replace(/[^/]+\/a$/, other.split('/').slice(-2).join('/'));
      expect(await putBy({ ...presigned, url: url.href }, body)).toBe(403);
      expect(await get().storage.head(other)).toBeNull();
    });

    test('ends when its time is over', async () => {
      const at = key();
      const old = await presign(at, { expiresSeconds: 60, nowMs: Date.now() - 61_000 });
      expect(await putBy(old, body)).toBe(403);
      const almost = await presign(at, { expiresSeconds: 60, nowMs: Date.now() - 30_000 });
      expect(await putBy(almost, body)).toBe(200);
    });

    test('is good for one time only', async ({ annotate }) => {
      const at = key();
      const presigned = await presign(at);
      expect(await putBy(presigned, body)).toBe(200);
      const again = await putBy(presigned, body);
      if (get().capabilities.conditionalPut) expect(again).toBe(412);
      else await annotate('this store does not keep conditional writes', 'warning');
      expect(Buffer.from(await get().storage.getBytes(at, body.length)).equals(body)).toBe(true);
    });
  });

  describe(`${name}: a presigned download`, () => {
    test('is saved under the name it was given, with its type, and never shown', async () => {
      const at = key();
      await store(at, 'bytes');
      const { url } = await get().storage.presignGet({
        key: at,
        expiresSeconds: 60,
        filename: 'Bett 7 "früh"/☃.wav',
        contentType: 'audio/wav',
      });
      const answer = await fetch(url);
      expect([answer.status, await answer.text(), answer.headers.get('content-type')]).toEqual([
        200,
        'bytes',
        'audio/wav',
      ]);
      expect(answer.headers.get('content-disposition')).toBe(
        `attachment; filename="Bett 7 _fr_h___.wav"; filename*=UTF-8''Bett%207%20%22fr%C3%BCh%22_%E2%98%83.wav`,
      );
    });

    test('may be read in ranges', async () => {
      const at = key();
      await store(at, '0123456789');
      const { url } = await get().storage.presignGet({
        key: at,
        expiresSeconds: 60,
        filename: 'x',
        contentType: 'audio/wav',
      });
      const answer = await fetch(url, { headers: { range: 'bytes=2-4' } });
      expect([answer.status, await answer.text(), answer.headers.get('content-range')]).toEqual([
        206,
        '234',
        'bytes 2-4/10',
      ]);
    });
  });
}
