import { GetObjectCommand, ListObjectsV2Command, PutObjectCommand } from '@aws-sdk/client-s3';
import { getSignedUrl } from '@aws-sdk/s3-request-presigner';
import { expect, test } from 'vitest';
import { BUCKET, clientFor, codeOf, fakeForTest, KEYS, send } from './support';

const list = new ListObjectsV2Command({ Bucket: BUCKET });

test('a request without credentials is denied', async () => {
  const fake = await fakeForTest();
  const answer = await send(fake.port, { method: 'GET', path: `/${BUCKET}` });
  expect([answer.status, answer.code]).toEqual([403, 'AccessDenied']);
});

test('another secret, another key and another region are each refused by their own name', async () => {
  const fake = await fakeForTest();
  const { accessKey: accessKeyId, secretKey: secretAccessKey } = KEYS;
  const secret = clientFor(fake, { credentials: { accessKeyId, secretAccessKey: 'other' } });
  expect(await codeOf(secret.send(list))).toBe('SignatureDoesNotMatch');
  const key = clientFor(fake, { credentials: { accessKeyId: 'other', secretAccessKey } });
  expect(await codeOf(key.send(list))).toBe('InvalidAccessKeyId');
  const region = clientFor(fake, { region: 'eu-west-1' });
  expect(await codeOf(region.send(list))).toBe('AuthorizationHeaderMalformed');
  expect(await codeOf(clientFor(fake).send(list))).toBeUndefined();
});

async function presigned(fake: { url: string }, expiresIn = 60): Promise<URL> {
  return new URL(
    await getSignedUrl(clientFor(fake), new GetObjectCommand({ Bucket: BUCKET, Key: 'k' }), { expiresIn }),
  );
}

const get = (fake: { port: number }, url: URL, headers: Record<string, string> = {}) =>
  send(fake.port, {
    method: 'GET',
    path: `${url.pathname}${url.search}`,
    headers: { host: url.host, ...headers },
  });

test('a presigned address is refused when any of its parts is changed or missing', async () => {
  const fake = await fakeForTest();
  expect((await get(fake, await presigned(fake))).code).toBe('NoSuchKey');
  const changes: [name: string, value: string | null, code: string][] = [
    ['X-Amz-Expires', '61', 'SignatureDoesNotMatch'],
    ['X-Amz-Expires', '604801', 'AuthorizationQueryParametersError'],
    ['X-Amz-Expires', 'soon', 'AuthorizationQueryParametersError'],
    ['X-Amz-Signature', '0'.repeat(64), 'SignatureDoesNotMatch'],
    ['X-Amz-Signature', 'short', 'SignatureDoesNotMatch'],
    ['X-Amz-Algorithm', 'AWS4-HMAC-SHA1', 'AuthorizationQueryParametersError'],
    ['X-Amz-Date', 'yesterday', 'AuthorizationQueryParametersError'],
    ['X-Amz-Credential', 'a/b', 'AuthorizationQueryParametersError'],
    ['X-Amz-SignedHeaders', null, 'AuthorizationQueryParametersError'],
    ['X-Amz-Signature', null, 'AuthorizationQueryParametersError'],
    ['versionId', 'null', 'SignatureDoesNotMatch'],
  ];
  for (const [name, value, code] of changes) {
    const url = await presigned(fake);
    if (value === null) url.searchParams.delete(name);
    else url.searchParams.set(name, value);
    expect([name, value, (await get(fake, url)).code]).toEqual([name, value, code]);
  }
});

test('a presigned address for one key and method opens no other', async () => {
  const fake = await fakeForTest();
  const url = await presigned(fake);
  const path = `${url.pathname}x${url.search}`;
  expect((await send(fake.port, { method: 'GET', path, headers: { host: url.host } })).code).toBe(
    'SignatureDoesNotMatch',
  );
  const remove = { method: 'DELETE', path: `${url.pathname}${url.search}`, headers: { host: url.host } };
  expect((await send(fake.port, remove)).code).toBe('SignatureDoesNotMatch');
});

test('a header that S3 acts on and the signature does not cover is refused', async () => {
  const fake = await fakeForTest();
  const answer = await get(fake, await presigned(fake), { 'x-amz-meta-note': 'slipped in' });
  expect([answer.status, answer.code]).toEqual([403, 'AccessDenied']);
  expect(answer.body.toString()).toContain('x-amz-meta-note');
});

test('a presigned address that is not valid yet is refused', async () => {
  let now = Date.now();
  const fake = await fakeForTest({ nowMs: () => now });
  const url = await presigned(fake);
  now -= 16 * 60_000;
  const answer = await get(fake, url);
  expect([answer.status, answer.code]).toEqual([403, 'AccessDenied']);
});

test('credentials in the header and in the query at once are refused', async () => {
  const fake = await fakeForTest();
  const answer = await get(fake, await presigned(fake), { authorization: 'AWS4-HMAC-SHA256 Credential=x' });
  expect([answer.status, answer.code]).toEqual([400, 'InvalidArgument']);
});

test('another algorithm is refused with the one to use', async () => {
  const fake = await fakeForTest();
  const headers = { authorization: 'Basic Zm9vOmJhcg==', 'x-amz-date': '20260101T000000Z' };
  const answer = await send(fake.port, { method: 'GET', path: '/', headers });
  expect([answer.status, answer.code]).toEqual([400, 'InvalidRequest']);
  expect(answer.body.toString()).toContain('AWS4-HMAC-SHA256');
});

// The older version is verified too, since some clients presign with it (foreign-clients.test.ts sends real ones).
test('a signature of version 2 that is wrong or late is refused', async () => {
  const fake = await fakeForTest();
  const later = Math.floor(Date.now() / 1000) + 60;
  const path = (expires: number, key = KEYS.accessKey) =>
    `/${BUCKET}/k?AWSAccessKeyId=${key}&Expires=${expires}&Signature=AAAAAAAAAAAAAAAAAAAAAAAAAAA%3D`;
  const code = async (target: string) => (await send(fake.port, { method: 'GET', path: target })).code;
  expect(await code(path(later))).toBe('SignatureDoesNotMatch');
  expect(await code(path(1))).toBe('AccessDenied');
  expect(await code(path(later, 'other'))).toBe('InvalidAccessKeyId');
});

test('the refusal of a signature says what was signed and nothing of the secret', async () => {
  const fake = await fakeForTest();
  const url = await presigned(fake);
  url.searchParams.set('X-Amz-Signature', '0'.repeat(64));
  const text = (await get(fake, url)).body.toString();
  expect(text).toContain('<StringToSign>');
  expect(text).not.toContain(KEYS.secretKey);
});

test('a presigned PUT binds what was signed into it', async () => {
  const fake = await fakeForTest();
  const command = new PutObjectCommand({
    Bucket: BUCKET,
    Key: 'k',
    ContentType: 'audio/wav',
    ContentLength: 3,
  });
  const signableHeaders = new Set(['host', 'content-type', 'content-length']);
  const url = new URL(await getSignedUrl(clientFor(fake), command, { expiresIn: 60, signableHeaders }));
  const put = (body: string, type: string) =>
    send(fake.port, {
      method: 'PUT',
      path: `${url.pathname}${url.search}`,
      headers: { host: url.host, 'content-type': type, 'content-length': String(body.length) },
      body: Buffer.from(body),
    });
  expect((await put('four', 'audio/wav')).code).toBe('SignatureDoesNotMatch');
  expect((await put('abc', 'text/html')).code).toBe('SignatureDoesNotMatch');
  expect(fake.backdoor.keys(BUCKET)).toEqual([]);
  expect((await put('abc', 'audio/wav')).status).toBe(200);
});
