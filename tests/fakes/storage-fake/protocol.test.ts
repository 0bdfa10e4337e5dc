import { request } from 'node:http';
import {
  CopyObjectCommand,
  CreateBucketCommand,
  DeleteBucketCommand,
  GetBucketLocationCommand,
  GetBucketVersioningCommand,
  GetObjectCommand,
  HeadBucketCommand,
  HeadObjectCommand,
  ListBucketsCommand,
  PutObjectCommand,
} from '@aws-sdk/client-s3';
import { getSignedUrl } from '@aws-sdk/s3-request-presigner';
import { describe, expect, test } from 'vitest';
import { parseXml, toXml } from '@/storage-fake/xml';
import { BUCKET, clientFor, codeOf, fakeForTest, send } from './support';

const at = { Bucket: BUCKET, Key: 'k' };

test.each([
  'a b/c+d&e=f?g#h%i.wav',
  '../../etc/passwd',
  './.././',
  '//double//slash/',
  'ünïcode/日本語/\u{1f3b5}',
  'quote\'"<xml>',
  'x'.repeat(1024),
  'é'.repeat(512),
  'line\nfeed\ttab',
  '.',
])('an object can be called %j', async (Key) => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  const named = { Bucket: BUCKET, Key };
  await client.send(new PutObjectCommand({ ...named, Body: 'here' }));
  expect(fake.backdoor.keys(BUCKET)).toEqual([Key]);
  const got = await client.send(new GetObjectCommand(named));
  expect(await got.Body?.transformToString()).toBe('here');
  await client.send(new CopyObjectCommand({ ...at, CopySource: `${BUCKET}/${encodeURIComponent(Key)}` }));
  const copy = await client.send(new GetObjectCommand(at));
  expect(await copy.Body?.transformToString()).toBe('here');
});

test('a key of 1,025 bytes is too long', async () => {
  const client = clientFor(await fakeForTest());
  expect(await codeOf(client.send(new PutObjectCommand({ ...at, Key: 'x'.repeat(1025), Body: '' })))).toBe(
    'KeyTooLongError',
  );
});

test('headers and metadata come back with the object, and a reader may ask for others', async () => {
  const client = clientFor(await fakeForTest());
  const kept = {
    ContentType: 'audio/flac',
    CacheControl: 'private',
    ContentDisposition: 'attachment',
    ContentLanguage: 'de',
    ContentEncoding: 'gzip',
    Metadata: { 'recorded-at': '2026-01-02' },
  };
  await client.send(new PutObjectCommand({ ...at, Body: 'x', ...kept }));
  expect(await client.send(new HeadObjectCommand(at))).toMatchObject({
    ...kept,
    ContentLength: 1,
    AcceptRanges: 'bytes',
  });
  const other = await client.send(
    new GetObjectCommand({ ...at, ResponseContentType: 'text/plain', ResponseContentDisposition: 'inline' }),
  );
  expect([other.ContentType, other.ContentDisposition]).toEqual(['text/plain', 'inline']);
});

// RFC 9110, 14.1.2 and 14.2.
test('ranges are served, and those outside are refused with the length', async () => {
  const client = clientFor(await fakeForTest());
  await client.send(new PutObjectCommand({ ...at, Body: '0123456789' }));
  const get = async (Range: string) => {
    const got = await client.send(new GetObjectCommand({ ...at, Range }));
    return [await got.Body?.transformToString(), got.ContentRange, got.ContentLength];
  };
  expect(await get('bytes=0-3')).toEqual(['0123', 'bytes 0-3/10', 4]);
  expect(await get('bytes=7-')).toEqual(['789', 'bytes 7-9/10', 3]);
  expect(await get('bytes=-2')).toEqual(['89', 'bytes 8-9/10', 2]);
  expect(await get('bytes=-99')).toEqual(['0123456789', 'bytes 0-9/10', 10]);
  expect(await get('bytes=5-99')).toEqual(['56789', 'bytes 5-9/10', 5]);
  // What is no range, is several or another unit counts as none.
  for (const none of ['bytes=4-2', 'bytes=0-1,3-4', 'lines=1-2', 'bytes=-']) {
    expect(await get(none)).toEqual(['0123456789', undefined, 10]);
  }
  for (const outside of ['bytes=10-', 'bytes=-0']) {
    expect(await codeOf(client.send(new GetObjectCommand({ ...at, Range: outside })))).toBe('InvalidRange');
  }
});

test('a copy keeps or replaces what is said about the object, and its conditions are about the source', async () => {
  const client = clientFor(await fakeForTest());
  const { ETag } = await client.send(
    new PutObjectCommand({
      ...at,
      Body: 'x',
      ContentType: 'audio/wav',
      Metadata: { a: '1' },
      ChecksumAlgorithm: 'SHA256',
    }),
  );
  const copy = (more: object) =>
    client.send(new CopyObjectCommand({ Bucket: BUCKET, Key: 'to', CopySource: `${BUCKET}/k`, ...more }));
  const head = () =>
    client.send(new HeadObjectCommand({ Bucket: BUCKET, Key: 'to', ChecksumMode: 'ENABLED' }));
  expect((await copy({})).CopyObjectResult?.ETag).toBe(ETag);
  expect(await head()).toMatchObject({ ContentType: 'audio/wav', Metadata: { a: '1' } });
  expect((await head()).ChecksumSHA256).toBeDefined();
  await copy({ MetadataDirective: 'REPLACE', ContentType: 'text/plain', Metadata: { b: '2' } });
  expect(await head()).toMatchObject({ ContentType: 'text/plain', Metadata: { b: '2' } });
  expect(await codeOf(copy({ CopySourceIfMatch: '"other"' }))).toBe('PreconditionFailed');
  expect(await codeOf(copy({ CopySourceIfNoneMatch: ETag }))).toBe('PreconditionFailed');
  expect(await codeOf(copy({ IfNoneMatch: '*' }))).toBe('PreconditionFailed');
  expect(await codeOf(copy({ CopySource: `${BUCKET}/nowhere` }))).toBe('NoSuchKey');
  expect(await codeOf(copy({ CopySource: 'nowhere-bucket/k' }))).toBe('NoSuchBucket');
  expect(await codeOf(copy({ CopySource: `${BUCKET}/to` }))).toBe('InvalidRequest');
});

test('buckets are made, found, listed and removed when empty', async () => {
  const client = clientFor(await fakeForTest());
  const Bucket = 'second-bucket';
  await client.send(new CreateBucketCommand({ Bucket }));
  expect(await codeOf(client.send(new CreateBucketCommand({ Bucket })))).toBe('BucketAlreadyOwnedByYou');
  expect(await codeOf(client.send(new CreateBucketCommand({ Bucket: 'Not_A_Bucket' })))).toBe(
    'InvalidBucketName',
  );
  expect((await client.send(new ListBucketsCommand({}))).Buckets?.map(({ Name }) => Name)).toEqual([
    BUCKET,
    Bucket,
  ]);
  expect((await client.send(new GetBucketLocationCommand({ Bucket }))).LocationConstraint).toBeUndefined();
  expect((await client.send(new GetBucketVersioningCommand({ Bucket }))).Status).toBeUndefined();
  await client.send(new PutObjectCommand({ Bucket, Key: 'k', Body: 'x' }));
  expect(await codeOf(client.send(new DeleteBucketCommand({ Bucket })))).toBe('BucketNotEmpty');
  expect(await codeOf(client.send(new HeadBucketCommand({ Bucket: 'nowhere' })))).toBe('NotFound');
  expect(await codeOf(client.send(new GetObjectCommand({ Bucket: 'nowhere', Key: 'k' })))).toBe(
    'NoSuchBucket',
  );
});

test('the bucket may stand in the host name', async () => {
  const fake = await fakeForTest();
  await clientFor(fake).send(new PutObjectCommand({ ...at, Body: 'here' }));
  const client = clientFor({ url: `http://localhost:${fake.port}` }, { forcePathStyle: false });
  const url = new URL(await getSignedUrl(client, new GetObjectCommand(at), { expiresIn: 60 }));
  expect(url.host).toBe(`${BUCKET}.localhost:${fake.port}`);
  const got = await send(fake.port, {
    method: 'GET',
    path: `${url.pathname}${url.search}`,
    headers: { host: url.host },
  });
  expect([got.status, got.body.toString()]).toEqual([200, 'here']);
});

test('an error is a document with a code, and none at all in answer to HEAD', async () => {
  const fake = await fakeForTest();
  const url = async (command: GetObjectCommand | HeadObjectCommand) =>
    new URL(await getSignedUrl(clientFor(fake), command, { expiresIn: 60 }));
  const call = async (method: string, { pathname, search, host }: URL) =>
    send(fake.port, { method, path: `${pathname}${search}`, headers: { host } });
  const answer = await call('GET', await url(new GetObjectCommand({ ...at, Key: 'a<b' })));
  const document = parseXml(answer.body.toString());
  expect([answer.status, answer.headers['content-type'], document.name]).toEqual([
    404,
    'application/xml',
    'Error',
  ]);
  const fields = Object.fromEntries(document.children.map(({ name, text }) => [name, text]));
  expect(fields).toMatchObject({
    Code: 'NoSuchKey',
    Key: 'a<b',
    RequestId: answer.headers['x-amz-request-id'],
  });
  const head = await call('HEAD', await url(new HeadObjectCommand(at)));
  expect([head.status, head.body.length]).toEqual([404, 0]);
});

test('what the store does not do is answered 501, not done otherwise', async () => {
  const fake = await fakeForTest();
  const url = new URL(await getSignedUrl(clientFor(fake), new PutObjectCommand(at), { expiresIn: 60 }));
  const answer = await send(fake.port, {
    method: 'PUT',
    path: `/${BUCKET}/k?restore`,
    headers: { host: url.host },
  });
  expect(answer.status).toBe(403);
  const client = clientFor(fake);
  const sse = new PutObjectCommand({ ...at, Body: 'x', ServerSideEncryption: 'aws:kms' });
  expect(await codeOf(client.send(sse))).toBe('NotImplemented');
  const acl = new PutObjectCommand({ ...at, Body: 'x', ACL: 'public-read' });
  expect(await codeOf(client.send(acl))).toBe('AccessControlListNotSupported');
  expect(fake.backdoor.keys(BUCKET)).toEqual([]);
});

// RFC 9110, 10.1.1: the body is sent only once the server has asked for it.
test('a client that waits is told to go on, or is refused before it sends its body', async () => {
  const fake = await fakeForTest();
  const url = new URL(await getSignedUrl(clientFor(fake), new PutObjectCommand(at), { expiresIn: 60 }));
  const put = (path: string) =>
    new Promise<{ status: number; asked: boolean }>((resolve, reject) => {
      let asked = false;
      const headers = { host: url.host, expect: '100-continue', 'content-length': '4' };
      const outgoing = request(
        { port: fake.port, method: 'PUT', path, headers, agent: false },
        (incoming) => {
          incoming.resume().on('end', () => resolve({ status: incoming.statusCode ?? 0, asked }));
          if (!asked) outgoing.destroy();
        },
      );
      outgoing.on('continue', () => {
        asked = true;
        outgoing.end('body');
      });
      outgoing.on('error', (error) => (asked ? reject(error) : undefined)).flushHeaders();
    });
  expect(await put(`${url.pathname}${url.search}`)).toEqual({ status: 200, asked: true });
  expect(await put(`${url.pathname}x${url.search}`)).toEqual({ status: 403, asked: false });
});

// Fetch Standard, "CORS protocol".
describe('a page of another origin', () => {
  const preflight = {
    origin: 'https://ward.example',
    'access-control-request-method': 'PUT',
    'access-control-request-headers': 'x-amz-checksum-sha256',
  };

  test('may ask and read, where any origin may', async () => {
    const fake = await fakeForTest();
    const asked = await send(fake.port, { method: 'OPTIONS', path: `/${BUCKET}/k`, headers: preflight });
    expect([asked.status, asked.headers['access-control-allow-origin']]).toEqual([200, '*']);
    expect(asked.headers['access-control-allow-methods']).toContain('PUT');
    expect(asked.headers['access-control-allow-headers']).toBe('x-amz-checksum-sha256');
    const refused = await send(fake.port, {
      method: 'GET',
      path: `/${BUCKET}/k`,
      headers: { origin: preflight.origin },
    });
    expect([refused.status, refused.headers['access-control-allow-origin']]).toEqual([403, '*']);
  });

  test('may not, where it is not one of those that may', async () => {
    const fake = await fakeForTest({ allowedOrigins: ['https://bellkeep.example'] });
    const asked = await send(fake.port, { method: 'OPTIONS', path: `/${BUCKET}/k`, headers: preflight });
    expect([asked.status, asked.headers['access-control-allow-origin']]).toEqual([403, undefined]);
    const allowed = { ...preflight, origin: 'https://bellkeep.example' };
    const other = await send(fake.port, { method: 'OPTIONS', path: `/${BUCKET}/k`, headers: allowed });
    expect([other.status, other.headers['access-control-allow-origin']]).toEqual([
      200,
      'https://bellkeep.example',
    ]);
  });
});

describe('the XML that clients send', () => {
  test('is read with its escapes, its namespace passed over', () => {
    const root = parseXml(
      '<?xml version="1.0"?><D xmlns="http://x/"><!-- c --><K>a&amp;b&#x1f3b5;&#10;<![CDATA[<c>]]></K><E/></D>',
    );
    expect(root).toMatchObject({
      name: 'D',
      children: [
        { name: 'K', text: 'a&b\u{1f3b5}\n<c>' },
        { name: 'E', text: '' },
      ],
    });
  });

  test.each([
    '',
    'text',
    '<a>',
    '<a></b>',
    '<a/><b/>',
    '<a>&undefined;</a>',
    '<a>&</a>',
    '<!DOCTYPE a [<!ENTITY x "y">]><a>&x;</a>',
    `${'<a>'.repeat(100)}${'</a>'.repeat(100)}`,
  ])('is refused when it is %j', (text) => {
    expect(() => parseXml(text)).toThrow(expect.objectContaining({ code: 'MalformedXML' }));
  });

  test('any text is read as it was written', () => {
    for (const text of ['<>&"\'', '\u0001\u001f\u007f\n', '\u{1f3b5}\uffff']) {
      expect(parseXml(toXml('a', { b: text })).children[0]?.text).toBe(text);
    }
  });
});
