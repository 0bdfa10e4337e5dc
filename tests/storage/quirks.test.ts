import { createHash } from 'node:crypto';
import { expect, test } from 'vitest';
import type { Storage } from '@/lib/storage/port';
import { putBy, sha256 } from './storeUnderTest';
import { BUCKET, storageForTest } from './support';

// Stores that lack something Bellkeep uses where it is there.

const retainUntilMs = Date.now() + 3_600_000;

async function arrive(
  storage: Storage,
  text = 'clip',
): Promise<{ expectedEtag: string; contentLength: number }> {
  await storage.put({ key: 'slot', body: Buffer.from(text), contentType: 'audio/wav' });
  const head = await storage.head('slot');
  return { expectedEtag: head?.etag ?? '', contentLength: head?.contentLength ?? 0 };
}

test.each([true, 'not-implemented'] as const)(
  'a store without object lock (%s) is used, and says that it locks nothing',
  async (noObjectLock) => {
    const { storage } = await storageForTest({ noObjectLock });
    const put = {
      key: 'head',
      body: Buffer.from('x'),
      contentType: 'text/plain',
      retainUntilMs,
      legalHold: true,
    };
    expect(await storage.put(put)).toEqual({ outcome: 'stored', lock: 'none' });
    expect(await storage.setRetention('head', retainUntilMs)).toBe('none');
    const request = {
      from: 'slot',
      to: 'original',
      retainUntilMs,
      contentType: 'audio/wav',
      ...(await arrive(storage)),
    };
    expect(await storage.seal(request)).toMatchObject({ outcome: 'sealed', lock: 'none' });
    expect(await storage.seal(request)).toMatchObject({ outcome: 'already', lock: 'none' });
    expect(await storage.check('check/')).toMatchObject({ ok: true, objectLock: false });
  },
);

test('a store that does not look at a signed SHA-256 takes other bytes, and the claim it repeats is no proof', async () => {
  const { storage } = await storageForTest({ ignoreSignedChecksum: true });
  const [said, sent] = [Buffer.from('said'), Buffer.from('sent')];
  const presigned = await storage.presignPut({
    key: 'slot',
    contentLength: 4,
    contentType: 'audio/wav',
    sha256: sha256(said),
    expiresSeconds: 60,
  });
  expect(await putBy(presigned, Buffer.from('longer'))).toBe(403);
  expect(await putBy(presigned, sent)).toBe(200);
  expect(Buffer.from((await storage.head('slot'))?.sha256 ?? []).equals(sha256(said))).toBe(true);
  expect(
    createHash('sha256')
      .update(await storage.getBytes('slot', 4))
      .digest()
      .equals(sha256(sent)),
  ).toBe(true);
});

test('a store that refuses streamed trailers is never sent any', async () => {
  const { storage } = await storageForTest({ refuseStreamedTrailers: true });
  expect(await storage.check('check/')).toMatchObject({ ok: true });
  expect(
    await storage.put({ key: 'k', body: new Uint8Array(3_000_000), contentType: 'x/y', retainUntilMs }),
  ).toMatchObject({ lock: 'compliance' });
});

test('devices are given the address at which they see the store', async () => {
  const { storage, fake } = await storageForTest({}, { publicEndpoint: 'https://objects.hospital.example' });
  const put = {
    key: 'k',
    contentLength: 1,
    contentType: 'audio/wav',
    sha256: sha256(Buffer.from('x')),
    expiresSeconds: 60,
  };
  expect(new URL((await storage.presignPut(put)).url).origin).toBe('https://objects.hospital.example');
  const get = { key: 'k', filename: 'f', contentType: 'audio/wav', expiresSeconds: 60 };
  expect(new URL((await storage.presignGet(get)).url).origin).toBe('https://objects.hospital.example');
  await storage.put({ key: 'k', body: Buffer.from('x'), contentType: 'audio/wav' });
  expect(fake.backdoor.keys(BUCKET)).toEqual(['k']);
});

test('an original that somebody unlocked behind the service is locked again when it is sealed again', async () => {
  const { storage, fake } = await storageForTest();
  const request = {
    from: 'slot',
    to: 'original',
    retainUntilMs,
    contentType: 'audio/wav',
    ...(await arrive(storage)),
  };
  await storage.seal(request);
  await fake.backdoor.unlock(BUCKET, 'original');
  expect(await storage.seal(request)).toMatchObject({ outcome: 'already', lock: 'compliance' });
  await expect(storage.remove('original')).rejects.toMatchObject({ code: 'locked' });
});

// Seen with one cluster: `x-amz-copy-source-if-match` was passed over, and conditional writes in a bucket with versions.
test('a store that passes over conditions seals no other bytes than were looked at, and replaces nothing', async () => {
  const { storage, fake } = await storageForTest({ ignoreWriteConditions: true });
  const { expectedEtag, contentLength } = await arrive(storage, 'seen');
  const request = {
    from: 'slot',
    to: 'original',
    retainUntilMs,
    contentType: 'audio/wav',
    expectedEtag,
    contentLength,
  };
  await storage.put({ key: 'slot', body: Buffer.from('swap'), contentType: 'audio/wav' });
  await expect(storage.seal(request)).rejects.toMatchObject({ code: 'precondition' });
  expect(fake.backdoor.keys(BUCKET)).toEqual(['slot']);

  const sealed = await storage.seal({ ...request, ...(await arrive(storage, 'seen')) });
  expect(sealed).toMatchObject({ outcome: 'sealed', lock: 'compliance' });
  const other = { ...request, ...(await arrive(storage, 'swap')) };
  await expect(storage.seal(other)).rejects.toMatchObject({ code: 'exists' });
  expect(String(await storage.getBytes('original', 4))).toBe('seen');

  const put = { key: 'k', contentType: 'text/plain', ifAbsent: true };
  expect(await storage.put({ ...put, body: Buffer.from('1') })).toMatchObject({ outcome: 'stored' });
  expect(await storage.put({ ...put, body: Buffer.from('2') })).toMatchObject({ outcome: 'exists' });
  const report = await storage.check('check/');
  expect(report.steps.filter(({ ok }) => !ok).map(({ name }) => name)).toEqual(['refuse to overwrite']);
});

test('a copy that was made and not yet locked when the process died is locked by the next call', async () => {
  const { storage, fake } = await storageForTest();
  const request = {
    from: 'slot',
    to: 'original',
    retainUntilMs,
    contentType: 'audio/wav',
    ...(await arrive(storage)),
  };
  fake.faults.add({ kind: 'internal-error', method: 'PUT', parameter: 'retention', count: 3 });
  await expect(storage.seal(request)).rejects.toMatchObject({ code: 'unavailable' });
  expect(await storage.seal(request)).toMatchObject({ outcome: 'already', lock: 'compliance' });
});

test('a tag that says nothing is made up for by the hash, where the caller knows it', async () => {
  const { storage } = await storageForTest();
  const { contentLength } = await arrive(storage);
  await storage.put({ key: 'original', body: Buffer.from('clip'), contentType: 'audio/wav' });
  // The tag of a source in parts; the original is the same bytes in one.
  const request = {
    from: 'slot',
    to: 'original',
    retainUntilMs,
    contentType: 'audio/wav',
    contentLength,
    expectedEtag: `${'0'.repeat(32)}-2`,
  };
  await expect(storage.seal(request)).rejects.toMatchObject({ code: 'exists' });
  await expect(storage.seal({ ...request, sha256: sha256(Buffer.from('clap')) })).rejects.toMatchObject({
    code: 'exists',
  });
  expect(await storage.seal({ ...request, sha256: sha256(Buffer.from('clip')) })).toMatchObject({
    outcome: 'already',
  });
});
