import { readFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import type { StorageFake } from '@/storage-fake/server';
import { fakeForTest, type RawAnswer, send } from './support';

// The worked examples of the Amazon S3 API reference ("Authenticating Requests (AWS Signature Version 4)"), sent to
// the fake as they are printed, with its clock at the moment they were made for.

const read = (name: string) =>
  JSON.parse(readFileSync(new URL(`../../reference/sigv4/${name}`, import.meta.url), 'utf8'));
const examples = read('s3-doc-examples.json');
const trailer = read('s3-trailer-example.json');
const NOW = Date.UTC(2013, 4, 24);

const fakeOf2013 = (options: { nowMs?: () => number } = {}): Promise<StorageFake> =>
  fakeForTest({
    accessKey: examples.accessKeyId,
    secretKey: examples.secretAccessKey,
    domains: ['s3.amazonaws.com'],
    nowMs: () => NOW,
    ...options,
  });

const authorization = (signedHeaders: string, signature: string) =>
  `AWS4-HMAC-SHA256 Credential=${examples.accessKeyId}/20130524/us-east-1/s3/aws4_request,SignedHeaders=${signedHeaders},Signature=${signature}`;

function printed(name: string): { method: string; path: string; headers: Record<string, string> } {
  const example = examples.examples.find((one: { name: string }) => one.name === name);
  const signed = authorization(Object.keys(example.headers).sort().join(';'), example.signature);
  const path = example.query === '' ? example.path : `${example.path}?${example.query}`;
  return { method: example.method, path, headers: { ...example.headers, authorization: signed } };
}

/** An `aws-chunked` body of the letter a, as printed. */
function chunkedBody(chunks: { bytesOfLetterA: number; signature: string }[], last = '\r\n'): Buffer {
  const parts = chunks.map(({ bytesOfLetterA, signature }) => {
    const head = `${bytesOfLetterA.toString(16)};chunk-signature=${signature}\r\n`;
    return bytesOfLetterA === 0 ? head : `${head}${'a'.repeat(bytesOfLetterA)}\r\n`;
  });
  return Buffer.from(parts.join('') + last);
}

function chunkedPut(fake: StorageFake, body: Buffer): Promise<RawAnswer> {
  const { headers, path, signature } = examples.chunkedUpload.seed;
  const signed = authorization(Object.keys(headers).sort().join(';'), signature);
  return send(fake.port, { method: 'PUT', path, headers: { ...headers, authorization: signed }, body });
}

const trailerLines = (value: string, signature: string) =>
  `${trailer.trailer.name}:${value}\r\nx-amz-trailer-signature:${signature}\r\n\r\n`;

function trailerPut(fake: StorageFake, body: Buffer): Promise<RawAnswer> {
  const signed = authorization(trailer.signedHeaders, trailer.seedSignature);
  const headers = { ...trailer.headers, authorization: signed, 'content-length': String(body.length) };
  return send(fake.port, { method: 'PUT', path: trailer.path, headers, body });
}

test('the printed PUT stores an object, and one changed byte of its body is refused', async () => {
  const fake = await fakeOf2013();
  const put = printed('PUT object');
  const body = Buffer.from('Welcome to Amazon S3.');
  const changed = await send(fake.port, { ...put, body: Buffer.from('Welcome to Amazon S4.') });
  expect([changed.status, changed.code]).toEqual([400, 'XAmzContentSHA256Mismatch']);
  expect(fake.backdoor.keys('examplebucket')).toEqual([]);
  expect((await send(fake.port, { ...put, body })).status).toBe(200);
  expect(fake.backdoor.keys('examplebucket')).toEqual(['test$file.text']);
});

test('the printed ranged GET is authenticated, and so is the printed presigned one', async () => {
  const fake = await fakeOf2013();
  const ranged = await send(fake.port, printed('GET object with Range'));
  expect([ranged.status, ranged.code]).toEqual([404, 'NoSuchKey']);
  const url = new URL(examples.presignedUrl);
  const presigned = await send(fake.port, {
    method: 'GET',
    path: `${url.pathname}${url.search}`,
    headers: { host: url.host },
  });
  expect([presigned.status, presigned.code]).toEqual([404, 'NoSuchKey']);
});

test('the printed list and lifecycle requests are authenticated', async () => {
  const fake = await fakeOf2013();
  const list = await send(fake.port, printed('list objects'));
  expect(list.status).toBe(200);
  expect(list.body.toString()).toContain('<Prefix>J</Prefix>');
  const lifecycle = await send(fake.port, printed('GET ?lifecycle'));
  expect([lifecycle.status, lifecycle.code]).toEqual([404, 'NoSuchLifecycleConfiguration']);
});

test('every printed request is refused when one header that it signed is changed', async () => {
  const fake = await fakeOf2013();
  for (const name of ['GET object with Range', 'PUT object']) {
    const request = printed(name);
    const header = name === 'PUT object' ? 'x-amz-storage-class' : 'range';
    const answer = await send(fake.port, {
      ...request,
      headers: { ...request.headers, [header]: 'bytes=0-8' },
    });
    expect([name, answer.status, answer.code]).toEqual([name, 403, 'SignatureDoesNotMatch']);
  }
});

test('the printed chunked upload is stored without its chunk marks', async () => {
  const fake = await fakeOf2013();
  const answer = await chunkedPut(fake, chunkedBody(examples.chunkedUpload.chunks));
  expect(answer.status).toBe(200);
  // MD5 of 66,560 times the letter a, from md5sum.
  expect(answer.headers.etag).toBe('"da0d2e17cd5a8f14633c6b4aebad7e02"');
  expect(fake.backdoor.keys('examplebucket')).toEqual(['chunkObject.txt']);
});

test('a chunk with one changed byte is refused and leaves nothing', async () => {
  const fake = await fakeOf2013();
  const body = chunkedBody(examples.chunkedUpload.chunks);
  body[66_000] = 0x62;
  const answer = await chunkedPut(fake, body);
  expect([answer.status, answer.code]).toEqual([403, 'SignatureDoesNotMatch']);
  expect(fake.backdoor.keys('examplebucket')).toEqual([]);
});

test('two chunks in the other order are refused', async () => {
  const fake = await fakeOf2013();
  const [first, second, last] = examples.chunkedUpload.chunks;
  const answer = await chunkedPut(fake, chunkedBody([second, first, last]));
  expect([answer.status, answer.code]).toEqual([403, 'SignatureDoesNotMatch']);
});

test('the printed upload with a trailing checksum is stored with that checksum', async () => {
  const fake = await fakeOf2013();
  const answer = await trailerPut(
    fake,
    chunkedBody(trailer.chunks, trailerLines(trailer.trailer.value, trailer.trailerSignature)),
  );
  expect(answer.status).toBe(200);
  expect(answer.headers['x-amz-checksum-crc32c']).toBe('sOO8/Q==');
});

test('a trailing checksum that is not the signed one is refused', async () => {
  const fake = await fakeOf2013();
  const other = await trailerPut(
    fake,
    chunkedBody(trailer.chunks, trailerLines('sOO8/g==', trailer.trailerSignature)),
  );
  expect([other.status, other.code]).toEqual([403, 'SignatureDoesNotMatch']);
  const none = await trailerPut(
    fake,
    chunkedBody(trailer.chunks, `${trailer.trailer.name}:${trailer.trailer.value}\r\n\r\n`),
  );
  expect([none.status, none.code]).toEqual([403, 'SignatureDoesNotMatch']);
  expect(fake.backdoor.keys('examplebucket')).toEqual([]);
});

test('a request a quarter of an hour and a second old is too skewed, a quarter of an hour is not', async () => {
  let now = NOW + 15 * 60_000;
  const fake = await fakeOf2013({ nowMs: () => now });
  expect((await send(fake.port, printed('list objects'))).status).toBe(200);
  now += 1000;
  const late = await send(fake.port, printed('list objects'));
  expect([late.status, late.code]).toEqual([403, 'RequestTimeTooSkewed']);
  now = NOW - 15 * 60_000 - 1000;
  const early = await send(fake.port, printed('list objects'));
  expect([early.status, early.code]).toEqual([403, 'RequestTimeTooSkewed']);
});

test('the printed presigned address ends after its 86,400 seconds', async () => {
  let now = NOW + 86_400_000;
  const fake = await fakeOf2013({ nowMs: () => now });
  const url = new URL(examples.presignedUrl);
  const get = { method: 'GET', path: `${url.pathname}${url.search}`, headers: { host: url.host } };
  expect((await send(fake.port, get)).code).toBe('NoSuchKey');
  now += 1;
  const after = await send(fake.port, get);
  expect([after.status, after.code]).toEqual([403, 'AccessDenied']);
  expect(after.body.toString()).toContain('Request has expired');
});
