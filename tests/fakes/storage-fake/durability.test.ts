import { type ChildProcess, spawn } from 'node:child_process';
import { createHash } from 'node:crypto';
import { readdirSync } from 'node:fs';
import { request } from 'node:http';
import { connect } from 'node:net';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import {
  CompleteMultipartUploadCommand,
  CreateMultipartUploadCommand,
  DeleteObjectCommand,
  GetObjectCommand,
  HeadObjectCommand,
  ListObjectsV2Command,
  ListPartsCommand,
  PutObjectCommand,
  UploadPartCommand,
} from '@aws-sdk/client-s3';
import { getSignedUrl } from '@aws-sdk/s3-request-presigner';
import { expect, onTestFinished, test } from 'vitest';
import { BUCKET, clientFor, codeOf, fakeForTest, KEYS, temporaryDirectory } from './support';

interface Running {
  url: string;
  process: ChildProcess;
  ended: Promise<number | null>;
}

/** The fake as a process of its own, as its command starts it. */
async function run(dir: string, extra: string[] = []): Promise<Running> {
  const args = [
    '--port',
    '0',
    '--dir',
    dir,
    '--access-key',
    KEYS.accessKey,
    '--secret-key',
    KEYS.secretKey,
    '--bucket',
    BUCKET,
  ];
  const child = spawn(process.execPath, ['--import', 'tsx', 'storage-fake/server.ts', ...args, ...extra], {
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  onTestFinished(() => void child.kill('SIGKILL'));
  const ended = new Promise<number | null>((resolve) => child.once('exit', resolve));
  const url = await new Promise<string>((resolve, reject) => {
    let text = '';
    child.stdout?.on('data', (piece: Buffer) => {
      text += piece.toString();
      const line = /^storage fake listening on (http:\/\/127\.0\.0\.1:\d+)$/m.exec(text);
      if (line !== null) resolve(line[1] as string);
    });
    void ended.then(() => reject(new Error(`ended: ${text}`)));
  });
  return { url, process: child, ended };
}

const at = { Bucket: BUCKET, Key: 'k' };

async function read(client: ReturnType<typeof clientFor>, Key: string): Promise<Buffer> {
  const got = await client.send(new GetObjectCommand({ Bucket: BUCKET, Key }));
  return Buffer.from((await got.Body?.transformToByteArray()) ?? []);
}

test('objects, metadata, locks and unfinished uploads survive a restart', async () => {
  const dir = temporaryDirectory();
  const first = await run(dir);
  const client = clientFor(first);
  const until = new Date(Date.now() + 3_600_000);
  await client.send(
    new PutObjectCommand({
      ...at,
      Body: 'kept',
      ContentType: 'audio/wav',
      Metadata: { note: 'n' },
      ChecksumAlgorithm: 'SHA256',
      ObjectLockMode: 'COMPLIANCE',
      ObjectLockRetainUntilDate: until,
    }),
  );
  const { UploadId } = await client.send(new CreateMultipartUploadCommand({ ...at, Key: 'parts' }));
  await client.send(new UploadPartCommand({ ...at, Key: 'parts', UploadId, PartNumber: 1, Body: 'part' }));
  first.process.kill('SIGTERM');
  expect(await first.ended).toBe(0);

  const again = clientFor(await run(dir));
  const head = await again.send(new HeadObjectCommand({ ...at, ChecksumMode: 'ENABLED' }));
  expect([head.ContentType, head.Metadata, head.ObjectLockMode]).toEqual([
    'audio/wav',
    { note: 'n' },
    'COMPLIANCE',
  ]);
  expect(head.ChecksumSHA256).toBe(createHash('sha256').update('kept').digest('base64'));
  expect(head.ObjectLockRetainUntilDate?.getTime()).toBe(until.getTime());
  expect(await codeOf(again.send(new DeleteObjectCommand(at)))).toBe('AccessDenied');
  const parts = await again.send(new ListPartsCommand({ ...at, Key: 'parts', UploadId }));
  const MultipartUpload = { Parts: parts.Parts?.map(({ PartNumber, ETag }) => ({ PartNumber, ETag })) };
  await again.send(new CompleteMultipartUploadCommand({ ...at, Key: 'parts', UploadId, MultipartUpload }));
  expect((await read(again, 'parts')).toString()).toBe('part');
});

test('killed while a body comes in, the store shows the object that was there before and nothing else', async () => {
  const dir = temporaryDirectory();
  const first = await run(dir);
  const before = Buffer.alloc(100_000, 1);
  await clientFor(first).send(new PutObjectCommand({ ...at, Body: before }));
  const length = 8_000_000;
  for (const Key of ['k', 'new']) {
    const url = new URL(
      await getSignedUrl(clientFor(first), new PutObjectCommand({ Bucket: BUCKET, Key }), { expiresIn: 60 }),
    );
    const put = request(url, { method: 'PUT', headers: { 'content-length': length } });
    put.on('error', () => undefined);
    put.write(Buffer.alloc(length - 1, 2));
  }
  // Until both bodies but their last byte are on disk.
  const blobs = join(dir, 'blobs');
  while (readdirSync(blobs).length < 3) await sleep(10);
  await sleep(200);
  first.process.kill('SIGKILL');
  await first.ended;

  const again = clientFor(await run(dir));
  const listed = await again.send(new ListObjectsV2Command({ Bucket: BUCKET }));
  expect(listed.Contents?.map(({ Key, Size }) => [Key, Size])).toEqual([['k', before.length]]);
  expect(Buffer.compare(await read(again, 'k'), before)).toBe(0);
  expect(readdirSync(blobs)).toHaveLength(1);
});

test('killed at any moment while it is busy, the store holds whole objects only, and every one it had acknowledged', async () => {
  const dir = temporaryDirectory();
  const bodyOf = (key: string) =>
    Buffer.from(`${key}:${createHash('sha256').update(key).digest('hex')}`.repeat(200));
  const acknowledged = new Set<string>();
  for (let round = 0; round < 3; round++) {
    const running = await run(dir);
    const client = clientFor(running);
    const writer = async (name: string): Promise<void> => {
      for (let i = 0; ; i++) {
        const key = `r${round}/${name}/${i}`;
        if (
          (await codeOf(
            client.send(new PutObjectCommand({ Bucket: BUCKET, Key: key, Body: bodyOf(key) })),
          )) !== undefined
        )
          return;
        acknowledged.add(key);
      }
    };
    const writers = Promise.all(['a', 'b', 'c', 'd'].map(writer));
    await sleep(150 + round * 70);
    running.process.kill('SIGKILL');
    await writers;
  }
  const client = clientFor(await run(dir));
  const found = new Set<string>();
  for (let ContinuationToken: string | undefined; ; ) {
    const page = await client.send(new ListObjectsV2Command({ Bucket: BUCKET, ContinuationToken }));
    for (const { Key } of page.Contents ?? []) found.add(Key as string);
    ContinuationToken = page.NextContinuationToken;
    if (!page.IsTruncated) break;
  }
  expect(acknowledged.size).toBeGreaterThan(0);
  expect([...acknowledged].filter((key) => !found.has(key))).toEqual([]);
  for (const key of found) expect((await read(client, key)).equals(bodyOf(key))).toBe(true);
});

test('a connection that is cut in the middle of a body leaves no object and no bytes', async () => {
  const dir = temporaryDirectory();
  const fake = await fakeForTest({ dir });
  const url = new URL(await getSignedUrl(clientFor(fake), new PutObjectCommand(at), { expiresIn: 60 }));
  const socket = connect(fake.port, '127.0.0.1');
  socket.write(
    `PUT ${url.pathname}${url.search} HTTP/1.1\r\nhost: ${url.host}\r\ncontent-length: 1000\r\n\r\nhalf`,
  );
  while (readdirSync(join(dir, 'blobs')).length === 0) await sleep(5);
  socket.destroy();
  while (readdirSync(join(dir, 'blobs')).length > 0) await sleep(5);
  expect(fake.backdoor.keys(BUCKET)).toEqual([]);
});

test('fifty writers at once each find their own bytes again', async () => {
  const client = clientFor(await fakeForTest());
  const keys = Array.from({ length: 50 }, (_, i) => `many/${i}`);
  await Promise.all(
    keys.map((Key) => client.send(new PutObjectCommand({ Bucket: BUCKET, Key, Body: `body of ${Key}` }))),
  );
  const bodies = await Promise.all(keys.map((key) => read(client, key)));
  expect(bodies.map(String)).toEqual(keys.map((key) => `body of ${key}`));
});

test('a reader that began before an overwrite reads the old bytes to their end', async () => {
  const client = clientFor(await fakeForTest());
  const old = Buffer.alloc(6_000_000, 1);
  await client.send(new PutObjectCommand({ ...at, Body: old }));
  const got = await client.send(new GetObjectCommand(at));
  await client.send(new PutObjectCommand({ ...at, Body: 'new' }));
  const bytes = Buffer.from((await got.Body?.transformToByteArray()) ?? []);
  expect(bytes.equals(old)).toBe(true);
});

test('overwriting and removing give the disk back', async () => {
  const dir = temporaryDirectory();
  const client = clientFor(await fakeForTest({ dir }));
  for (const body of ['one', 'two', 'three']) await client.send(new PutObjectCommand({ ...at, Body: body }));
  expect(readdirSync(join(dir, 'blobs'))).toHaveLength(1);
  await client.send(new DeleteObjectCommand(at));
  expect(readdirSync(join(dir, 'blobs'))).toHaveLength(0);
});

test('the command says what it wants and ends when it is not given it', async () => {
  const child = spawn(process.execPath, ['--import', 'tsx', 'storage-fake/server.ts', '--port', '0'], {
    stdio: ['ignore', 'ignore', 'pipe'],
  });
  let text = '';
  child.stderr.on('data', (piece: Buffer) => {
    text += piece.toString();
  });
  expect(await new Promise((resolve) => child.once('close', resolve))).toBe(2);
  expect(text).toContain('--access-key');
});
