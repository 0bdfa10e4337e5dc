import { describe, expect, test } from 'vitest';
import { putBy, type StoreUnderTest, sha256, writersFor } from './storeUnderTest';

export function describeSealing(name: string, get: () => StoreUnderTest): void {
  const { key, store } = writersFor(get);

  describe(`${name}: sealing`, () => {
    const retainUntilMs = Date.now() + 120_000;

    async function arrived(
      bytes: Buffer,
    ): Promise<{ from: string; expectedEtag: string; contentLength: number }> {
      const from = key('slot');
      await store(from, bytes);
      const head = await get().storage.head(from);
      return { from, expectedEtag: head?.etag as string, contentLength: bytes.length };
    }
    const seal = (source: Awaited<ReturnType<typeof arrived>>, to: string) =>
      get().storage.seal({ ...source, to, retainUntilMs, contentType: 'audio/flac' });

    test('copies to the final key and locks there, and a second time finds it done', async ({ annotate }) => {
      const [source, to] = [await arrived(Buffer.from('clip')), key('original')];
      const lock = get().capabilities.objectLock ? 'compliance' : 'none';
      expect(await seal(source, to)).toMatchObject({ outcome: 'sealed', lock });
      expect(await seal(source, to)).toMatchObject({ outcome: 'already', lock });
      const head = await get().storage.head(to);
      expect([head?.contentLength, head?.contentType]).toEqual([4, 'audio/flac']);
      if (lock === 'none') return annotate('this store has no object lock', 'warning');
      expect(Math.abs((head?.retainUntilMs ?? 0) - retainUntilMs)).toBeLessThan(1000);
      await expect(get().storage.remove(to)).rejects.toMatchObject({ code: 'locked' });
    });

    test('is found done also when its source is gone', async () => {
      const [source, to] = [await arrived(Buffer.from('clip')), key('original')];
      await seal(source, to);
      await get().storage.remove(source.from);
      expect(await seal(source, to)).toMatchObject({ outcome: 'already' });
    });

    test('never replaces what stands at the final key', async () => {
      const to = key('original');
      await seal(await arrived(Buffer.from('first')), to);
      await expect(seal(await arrived(Buffer.from('other')), to)).rejects.toMatchObject({ code: 'exists' });
      await expect(seal(await arrived(Buffer.from('longer one')), to)).rejects.toMatchObject({
        code: 'exists',
      });
      expect(String(await get().storage.getBytes(to, 100))).toBe('first');
    });

    test('refuses bytes that are not the ones that were looked at', async () => {
      const [source, to] = [await arrived(Buffer.from('seen')), key('original')];
      await store(source.from, 'swap');
      await expect(seal(source, to)).rejects.toMatchObject({ code: 'precondition' });
      await get().storage.remove(source.from);
      await expect(seal(source, to)).rejects.toMatchObject({ code: 'not-found' });
      expect(await get().storage.head(to)).toBeNull();
    });

    test('stands against the address by which the bytes came, however often that is used', async () => {
      const [from, to, body] = [key('slot'), key('original'), Buffer.from('clip')];
      const presigned = await get().storage.presignPut({
        key: from,
        contentLength: body.length,
        contentType: 'audio/wav',
        sha256: sha256(body),
        expiresSeconds: 60,
      });
      await putBy(presigned, body);
      const head = await get().storage.head(from);
      await seal({ from, expectedEtag: head?.etag as string, contentLength: body.length }, to);
      await get().storage.remove(from);
      await putBy(presigned, body);
      await putBy(presigned, Buffer.from('evil'));
      expect(String(await get().storage.getBytes(to, 100))).toBe('clip');
    });

    test('of ten at once gives one original, and each is told that it is there', async () => {
      const [source, to] = [await arrived(Buffer.from('clip')), key('original')];
      const outcomes = await Promise.all(Array.from({ length: 10 }, () => seal(source, to)));
      expect(outcomes.every(({ outcome }) => outcome === 'sealed' || outcome === 'already')).toBe(true);
      expect(String(await get().storage.getBytes(to, 100))).toBe('clip');
    });

    test('with a retention that is over already locks nothing', async () => {
      const [source, to] = [await arrived(Buffer.from('clip')), key('original')];
      const request = { ...source, to, retainUntilMs: Date.now() - 1000, contentType: 'audio/wav' };
      expect(await get().storage.seal(request)).toMatchObject({ outcome: 'sealed', lock: 'none' });
      expect(await get().storage.seal(request)).toMatchObject({ outcome: 'already', lock: 'none' });
    });
  });

  describe(`${name}: a lock`, () => {
    test('put with the object keeps it, and is lengthened', async ({ annotate }) => {
      const at = key('head');
      const { lock } = await store(at, 'signed head', { retainUntilMs: Date.now() + 60_000, ifAbsent: true });
      if (!get().capabilities.objectLock) {
        expect(lock).toBe('none');
        expect(await get().storage.setRetention(at, Date.now() + 60_000)).toBe('none');
        return annotate('this store has no object lock', 'warning');
      }
      expect(lock).toBe('compliance');
      const longer = Date.now() + 180_000;
      expect(await get().storage.setRetention(at, longer)).toBe('compliance');
      expect(Math.abs(((await get().storage.head(at))?.retainUntilMs ?? 0) - longer)).toBeLessThan(1000);
      await expect(get().storage.remove(at)).rejects.toMatchObject({ code: 'locked' });
    });
  });
}
