import { createServer } from 'node:net';
import { inspect } from 'node:util';
import { expect, onTestFinished, test } from 'vitest';
import { StorageError } from '@/lib/storage/port';
import { createS3Storage, type StorageRequest } from '@/lib/storage/s3';
import { BUCKET, SECRET, storageForTest } from './support';

const put = { key: 'k', body: Buffer.from('bytes'), contentType: 'audio/wav' };

async function failureOf(work: Promise<unknown>): Promise<StorageError> {
  try {
    await work;
  } catch (error) {
    expect(error).toBeInstanceOf(StorageError);
    return error as StorageError;
  }
  throw new Error('it did not fail');
}

test('a store that is busy for a moment is asked again', async () => {
  const { storage, fake } = await storageForTest();
  fake.faults.add({ kind: 'slow-down', method: 'PUT', count: 2 });
  expect(await storage.put(put)).toMatchObject({ outcome: 'stored' });
});

test('a store that stays busy is unavailable, and its check says so without trying on', async () => {
  const { storage, fake } = await storageForTest({}, { patience: { attempts: 1 } });
  const id = fake.faults.add({ kind: 'slow-down' });
  expect(await failureOf(storage.put(put))).toMatchObject({
    code: 'unavailable',
    status: 503,
    operation: 'put',
    key: 'k',
  });
  expect((await failureOf(storage.head('k'))).code).toBe('unavailable');
  const report = await storage.check('c/');
  expect([report.ok, report.steps[0]?.detail, report.steps[1]?.detail]).toEqual([
    false,
    'unavailable',
    'not tried',
  ]);
  expect(fake.faults.met(id)).toBe(3);
});

test('a full disk is unavailable, and nothing is there', async () => {
  const { storage, fake } = await storageForTest();
  fake.faults.add({ kind: 'full-disk' });
  expect((await failureOf(storage.put(put))).code).toBe('unavailable');
  fake.faults.clear();
  expect(await storage.head('k')).toBeNull();
});

test("a put whose answer was lost is known for its own, not for somebody else's", async () => {
  const { storage, fake } = await storageForTest();
  fake.faults.add({ kind: 'answer-lost', method: 'PUT', count: 1 });
  expect(await storage.put({ ...put, ifAbsent: true })).toMatchObject({ outcome: 'stored' });
  expect(await storage.put({ ...put, ifAbsent: true })).toMatchObject({ outcome: 'exists' });
});

test('a put that was never carried out is carried out once', async () => {
  const { storage, fake } = await storageForTest();
  fake.faults.add({ kind: 'internal-error', method: 'PUT', count: 1 });
  expect(await storage.put({ ...put, ifAbsent: true })).toMatchObject({ outcome: 'stored' });
});

test('a seal whose answer was lost is found done', async () => {
  const { storage, fake } = await storageForTest();
  await storage.put({ ...put, key: 'slot' });
  const head = await storage.head('slot');
  fake.faults.add({ kind: 'answer-lost', method: 'PUT', key: /^original$/, count: 1 });
  const request = {
    from: 'slot',
    to: 'original',
    retainUntilMs: Date.now() + 60_000,
    contentType: 'audio/wav',
    expectedEtag: head?.etag ?? '',
    contentLength: 5,
  };
  expect(await storage.seal(request)).toMatchObject({ lock: 'compliance' });
  expect(String(await storage.getBytes('original', 5))).toBe('bytes');
});

test('a body that is cut is a bad response, not a short clip', async () => {
  const { storage, fake } = await storageForTest();
  await storage.put({ ...put, body: new Uint8Array(200_000) });
  fake.faults.add({ kind: 'cut-body', atByte: 150_000 });
  expect((await failureOf(storage.getBytes('k', 1_000_000))).code).toBe('bad-response');
  const { body } = await storage.getStream('k');
  let bytes = 0;
  const read = async () => {
    for await (const piece of body) bytes += piece.length;
  };
  expect((await failureOf(read())).code).toBe('bad-response');
  expect(bytes).toBe(150_000);
});

test('a store that falls silent is a timeout', async () => {
  const patience = { connectMilliseconds: 500, idleMilliseconds: 150, attempts: 1 };
  const { storage, fake } = await storageForTest({}, { patience });
  fake.faults.add({ kind: 'delay', milliseconds: 3000 });
  expect((await failureOf(storage.head('k'))).code).toBe('timeout');
});

test('an address where nobody listens is unavailable', async () => {
  const server = createServer();
  const port = await new Promise<number>((resolve) =>
    server.listen(0, () => resolve((server.address() as { port: number }).port)),
  );
  await new Promise((resolve) => server.close(resolve));
  const storage = createS3Storage({
    endpoint: `http://127.0.0.1:${port}`,
    region: 'us-east-1',
    bucket: BUCKET,
    accessKeyId: 'a',
    secretAccessKey: SECRET,
    forcePathStyle: true,
  });
  expect((await failureOf(storage.put(put))).code).toBe('unavailable');
  const report = await storage.check('c/');
  expect(report.ok).toBe(false);
  expect(report.steps[0]).toMatchObject({ name: 'write', ok: false, detail: 'unavailable' });
});

test('something that answers and is no object store is a bad response', async () => {
  const server = createServer((socket) => {
    socket
      .on('error', () => undefined)
      .on('data', () =>
        socket.end('HTTP/1.1 200 OK\r\ncontent-length: 5\r\ncontent-type: text/html\r\n\r\nhello'),
      );
  });
  const port = await new Promise<number>((resolve) =>
    server.listen(0, () => resolve((server.address() as { port: number }).port)),
  );
  onTestFinished(() => void server.close());
  const storage = createS3Storage({
    endpoint: `http://127.0.0.1:${port}`,
    region: 'us-east-1',
    bucket: BUCKET,
    accessKeyId: 'a',
    secretAccessKey: SECRET,
    forcePathStyle: true,
  });
  expect((await failureOf(storage.list(''))).code).toBe('bad-response');
});

test('wrong keys, a wrong bucket and a clock that is off are told apart from an outage', async () => {
  const wrong = await storageForTest({}, { secretAccessKey: 'not-the-secret' });
  expect((await failureOf(wrong.storage.put(put))).code).toBe('denied');
  const bucket = await storageForTest({}, { bucket: 'another-bucket' });
  expect((await failureOf(bucket.storage.put(put))).code).toBe('not-found');
  const clock = await storageForTest({ nowMs: () => Date.now() + 86_400_000 });
  const presigned = await clock.storage.presignPut({
    key: 'k',
    contentLength: 5,
    contentType: 'x/y',
    sha256: new Uint8Array(32),
    expiresSeconds: 60,
  });
  expect(
    (await fetch(presigned.url, { method: 'PUT', headers: presigned.headers, body: 'bytes' })).status,
  ).toBe(403);
});

test('no error and no report of a request shows a secret or a presigned address', async () => {
  const seen: StorageRequest[] = [];
  const onRequest = (request: StorageRequest): void => void seen.push(request);
  const { storage, fake } = await storageForTest({}, { onRequest });
  const wrong = await storageForTest({}, { secretAccessKey: `${SECRET}x`, onRequest });
  await storage.presignPut({
    key: 'k',
    contentLength: 1,
    contentType: 'x/y',
    sha256: new Uint8Array(32),
    expiresSeconds: 60,
  });
  await storage.put({ ...put, retainUntilMs: Date.now() + 60_000 });
  fake.faults.add({ kind: 'cut-body', method: 'GET', key: /^k$/, atByte: 1 });
  const failures = [
    await failureOf(storage.remove('k')),
    await failureOf(storage.getBytes('k', 100)),
    await failureOf(storage.getStream('none')),
    await failureOf(wrong.storage.put(put)),
    await failureOf(wrong.storage.list('')),
  ];
  expect(failures.map(({ code }) => code)).toEqual([
    'locked',
    'bad-response',
    'not-found',
    'denied',
    'denied',
  ]);
  const shown = inspect([failures, seen], { depth: 20, showHidden: true }) + JSON.stringify(seen);
  for (const secret of [SECRET, 'X-Amz-', 'AWS4-HMAC', 'Signature=', fake.url])
    expect(shown).not.toContain(secret);
  expect(seen.filter(({ operation }) => operation === 'put').map(({ outcome }) => outcome)).toEqual([
    'ok',
    'denied',
  ]);
});
