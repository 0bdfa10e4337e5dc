import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { GetObjectCommand, ListObjectsV2Command, PutObjectCommand } from '@aws-sdk/client-s3';
import { expect, test } from 'vitest';
import { BUCKET, clientFor, codeOf, fakeForTest, temporaryDirectory } from './support';

const at = { Bucket: BUCKET, Key: 'wards/7/clip.wav' };
const put = (Body = 'bytes') => new PutObjectCommand({ ...at, Body });
const get = () => new GetObjectCommand(at);

test('SlowDown meets the requests it was meant for, as often as was said', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  const id = fake.faults.add({ kind: 'slow-down', method: 'PUT', key: /^wards\/7\//, count: 2 });
  const other = new PutObjectCommand({ ...at, Key: 'wards/8/clip.wav', Body: 'x' });
  expect(await codeOf(client.send(other))).toBeUndefined();
  expect([
    await codeOf(client.send(put())),
    await codeOf(client.send(put())),
    await codeOf(client.send(put())),
  ]).toEqual(['SlowDown', 'SlowDown', undefined]);
  expect(fake.faults.met(id)).toBe(2);
});

test('a full disk refuses the body where it ends and leaves neither object nor bytes', async () => {
  const dir = temporaryDirectory();
  const fake = await fakeForTest({ dir });
  const client = clientFor(fake);
  fake.faults.add({ kind: 'full-disk', atByte: 1000, count: 1 });
  expect(await codeOf(client.send(put('x'.repeat(5000))))).toBe('InternalError');
  expect(fake.backdoor.keys(BUCKET)).toEqual([]);
  expect(readdirSync(join(dir, 'blobs'))).toEqual([]);
  expect(await codeOf(client.send(put('x'.repeat(5000))))).toBeUndefined();
});

test('an answer that is lost leaves the work done', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  fake.faults.add({ kind: 'answer-lost', method: 'PUT', count: 1 });
  expect(await codeOf(client.send(put()))).toBeDefined();
  expect(fake.backdoor.keys(BUCKET)).toEqual([at.Key]);
});

test('a body is cut where it was told to be', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  await client.send(put('x'.repeat(100_000)));
  fake.faults.add({ kind: 'cut-body', atByte: 70_000, count: 1 });
  const got = await client.send(get());
  expect(got.ContentLength).toBe(100_000);
  let bytes = 0;
  const reading = (async () => {
    for await (const piece of got.Body as AsyncIterable<Uint8Array>) bytes += piece.length;
  })();
  await expect(reading).rejects.toThrow();
  expect(bytes).toBe(70_000);
});

test('wrong bytes differ in one bit and in nothing that is said about them', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  await client.send(put('x'.repeat(1000)));
  fake.faults.add({ kind: 'wrong-bytes', atByte: 500, count: 1 });
  const read = async () => (await client.send(get())).Body?.transformToString();
  expect(await read()).toBe(`${'x'.repeat(500)}y${'x'.repeat(499)}`);
  expect(await read()).toBe('x'.repeat(1000));
});

test('a listing may come back empty while the objects are there', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  await client.send(put());
  fake.faults.add({ kind: 'empty-listing', count: 1 });
  const list = async () => (await client.send(new ListObjectsV2Command({ Bucket: BUCKET }))).KeyCount;
  expect([await list(), await list()]).toEqual([0, 1]);
});

test('a delayed request is answered all the same', async () => {
  const fake = await fakeForTest();
  const id = fake.faults.add({ kind: 'delay', milliseconds: 30, parameter: 'list-type' });
  expect(await codeOf(clientFor(fake).send(new ListObjectsV2Command({ Bucket: BUCKET })))).toBeUndefined();
  expect(await codeOf(clientFor(fake).send(put()))).toBeUndefined();
  expect(fake.faults.met(id)).toBe(1);
});

test('faults are switched over HTTP where that was asked for, and only there', async () => {
  const fake = await fakeForTest({ faultsOverHttp: true });
  const admin = `${fake.url}/-/faults`;
  const post = (rule: unknown) => fetch(admin, { method: 'POST', body: JSON.stringify(rule) });
  expect((await post({ kind: 'earthquake' })).status).toBe(400);
  expect((await post({ kind: 'slow-down', key: 'clip', count: 1 })).status).toBe(201);
  expect(await codeOf(clientFor(fake).send(put()))).toBe('SlowDown');
  expect(await (await fetch(admin)).json()).toMatchObject([{ kind: 'slow-down', key: 'clip', met: 1 }]);
  await fetch(admin, { method: 'DELETE' });
  expect(fake.faults.list()).toEqual([]);
  const closed = await fakeForTest();
  expect((await fetch(`${closed.url}/-/faults`)).status).toBe(403);
});

test('the way past all locks changes bytes, takes off a lock and removes', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  const until = new Date(Date.now() + 3_600_000);
  await client.send(
    new PutObjectCommand({
      ...at,
      Body: 'true',
      ChecksumAlgorithm: 'SHA256',
      ObjectLockMode: 'COMPLIANCE',
      ObjectLockRetainUntilDate: until,
    }),
  );
  await fake.backdoor.replaceBytes(BUCKET, at.Key, Buffer.from('fals'));
  const got = await client.send(get());
  expect([await got.Body?.transformToString(), got.ObjectLockMode]).toEqual(['fals', 'COMPLIANCE']);
  await fake.backdoor.unlock(BUCKET, at.Key);
  expect((await client.send(get())).ObjectLockMode).toBeUndefined();
  await fake.backdoor.remove(BUCKET, at.Key);
  expect(await codeOf(client.send(get()))).toBe('NoSuchKey');
});
