import { createHash } from 'node:crypto';
import {
  AbortMultipartUploadCommand,
  type CompletedPart,
  CompleteMultipartUploadCommand,
  CreateMultipartUploadCommand,
  type CreateMultipartUploadCommandInput,
  GetObjectCommand,
  HeadObjectCommand,
  ListMultipartUploadsCommand,
  ListPartsCommand,
  PutObjectCommand,
  type S3Client,
  UploadPartCommand,
  UploadPartCopyCommand,
} from '@aws-sdk/client-s3';
import { expect, test } from 'vitest';
import { BUCKET, clientFor, codeOf, fakeForTest } from './support';

const at = { Bucket: BUCKET, Key: 'big' };
const MIB = 1024 * 1024;
const PARTS = [Buffer.alloc(5 * MIB, 1), Buffer.alloc(5 * MIB, 2), Buffer.from('the rest')];
const md5 = (data: Uint8Array) => createHash('md5').update(data).digest();

async function begin(
  client: S3Client,
  more: Partial<CreateMultipartUploadCommandInput> = {},
): Promise<string> {
  return (await client.send(new CreateMultipartUploadCommand({ ...at, ...more }))).UploadId as string;
}

async function upload(
  client: S3Client,
  UploadId: string,
  parts: Buffer[],
  more: object = {},
): Promise<CompletedPart[]> {
  return Promise.all(
    parts.map(async (Body, i) => {
      const part = await client.send(
        new UploadPartCommand({ ...at, UploadId, PartNumber: i + 1, Body, ...more }),
      );
      return { ...part, PartNumber: i + 1 };
    }),
  );
}

const complete = (client: S3Client, UploadId: string, Parts: CompletedPart[], more: object = {}) =>
  client.send(new CompleteMultipartUploadCommand({ ...at, UploadId, MultipartUpload: { Parts }, ...more }));

test('parts become one object with what the upload was begun with, and its tag is that of the parts', async () => {
  const client = clientFor(await fakeForTest());
  const id = await begin(client, { ContentType: 'audio/wav', Metadata: { note: 'n' } });
  const parts = await upload(client, id, PARTS);
  const done = await complete(client, id, parts);
  // MD5 over the MD5s of the parts, a dash, their number: common practice.
  expect(done.ETag).toBe(`"${md5(Buffer.concat(PARTS.map(md5))).toString('hex')}-3"`);
  const got = await client.send(new GetObjectCommand(at));
  expect([got.ContentType, got.Metadata]).toEqual(['audio/wav', { note: 'n' }]);
  expect(Buffer.concat(PARTS).equals(Buffer.from((await got.Body?.transformToByteArray()) ?? []))).toBe(true);
  const second = await client.send(new GetObjectCommand({ ...at, PartNumber: 3 }));
  expect([await second.Body?.transformToString(), second.PartsCount]).toEqual(['the rest', 3]);
  expect(await codeOf(client.send(new ListPartsCommand({ ...at, UploadId: id })))).toBe('NoSuchUpload');
});

test('a part sent again counts as it was last sent, and parts that are not named are left out', async () => {
  const client = clientFor(await fakeForTest());
  const id = await begin(client);
  await upload(client, id, [Buffer.from('first try'), Buffer.from('not named')]);
  const [again] = await upload(client, id, [Buffer.from('second try')]);
  await complete(client, id, [again as CompletedPart]);
  const got = await client.send(new GetObjectCommand(at));
  expect(await got.Body?.transformToString()).toBe('second try');
});

test('lists of parts that cannot be right are refused and the upload goes on', async () => {
  const client = clientFor(await fakeForTest());
  const id = await begin(client);
  const [one, two] = (await upload(client, id, [Buffer.from('small'), Buffer.from('two')])) as [
    CompletedPart,
    CompletedPart,
  ];
  expect(await codeOf(complete(client, id, [two, one]))).toBe('InvalidPartOrder');
  expect(await codeOf(complete(client, id, [one, one]))).toBe('InvalidPartOrder');
  expect(await codeOf(complete(client, id, [{ ...one, ETag: two.ETag }]))).toBe('InvalidPart');
  expect(await codeOf(complete(client, id, [{ ...one, PartNumber: 9 }]))).toBe('InvalidPart');
  expect(await codeOf(complete(client, id, [one, two]))).toBe('EntityTooSmall');
  expect(await codeOf(complete(client, id, [one], { MpuObjectSize: 4 }))).toBe('InvalidRequest');
  expect(await codeOf(client.send(new HeadObjectCommand(at)))).toBe('NotFound');
  expect(await codeOf(complete(client, id, [one]))).toBeUndefined();
});

test('an upload that is broken off is gone with its parts', async () => {
  const client = clientFor(await fakeForTest());
  const id = await begin(client);
  await upload(client, id, [Buffer.from('x')]);
  const list = async () =>
    (await client.send(new ListMultipartUploadsCommand({ Bucket: BUCKET }))).Uploads ?? [];
  expect((await list()).map(({ Key, UploadId }) => [Key, UploadId])).toEqual([['big', id]]);
  await client.send(new AbortMultipartUploadCommand({ ...at, UploadId: id }));
  expect(await list()).toEqual([]);
  expect(await codeOf(upload(client, id, [Buffer.from('x')]))).toBe('NoSuchUpload');
});

test('uploads and parts are listed page by page', async () => {
  const client = clientFor(await fakeForTest());
  const ids = [
    await begin(client, { Key: 'a' }),
    await begin(client, { Key: 'b' }),
    await begin(client, { Key: 'b' }),
  ];
  const seen: string[] = [];
  for (let marker: { KeyMarker?: string; UploadIdMarker?: string } = {}; ; ) {
    const page = await client.send(
      new ListMultipartUploadsCommand({ Bucket: BUCKET, MaxUploads: 1, ...marker }),
    );
    seen.push(...(page.Uploads ?? []).map(({ UploadId }) => UploadId as string));
    marker = { KeyMarker: page.NextKeyMarker, UploadIdMarker: page.NextUploadIdMarker };
    if (!page.IsTruncated) break;
  }
  expect([...seen].sort()).toEqual([...ids].sort());
  const id = await begin(client);
  await upload(client, id, [Buffer.from('1'), Buffer.from('2'), Buffer.from('3')]);
  const first = await client.send(new ListPartsCommand({ ...at, UploadId: id, MaxParts: 2 }));
  expect([first.Parts?.map(({ PartNumber }) => PartNumber), first.IsTruncated]).toEqual([[1, 2], true]);
  const rest = await client.send(
    new ListPartsCommand({ ...at, UploadId: id, PartNumberMarker: first.NextPartNumberMarker }),
  );
  expect([rest.Parts?.map(({ PartNumber }) => PartNumber), rest.IsTruncated]).toEqual([[3], false]);
});

test('a part may be copied from a range of another object', async () => {
  const client = clientFor(await fakeForTest());
  await client.send(new PutObjectCommand({ Bucket: BUCKET, Key: 'a b/ü+', Body: '0123456789' }));
  const id = await begin(client);
  const copied = await client.send(
    new UploadPartCopyCommand({
      ...at,
      UploadId: id,
      PartNumber: 1,
      CopySource: `${BUCKET}/${encodeURIComponent('a b/ü+')}`,
      CopySourceRange: 'bytes=2-5',
    }),
  );
  await complete(client, id, [{ PartNumber: 1, ETag: copied.CopyPartResult?.ETag }]);
  const got = await client.send(new GetObjectCommand(at));
  expect(await got.Body?.transformToString()).toBe('2345');
});

// "Checking object integrity", Amazon S3 user guide: SHA over the parts' hashes, CRC also over the whole object.
test('a composite SHA-256 is taken over the hashes of the parts, a CRC may be taken over the whole', async () => {
  const client = clientFor(await fakeForTest());
  const sha = (data: Uint8Array) => createHash('sha256').update(data).digest();
  const composite = await begin(client, { ChecksumAlgorithm: 'SHA256' });
  const parts = await upload(client, composite, PARTS, { ChecksumAlgorithm: 'SHA256' });
  const done = await complete(client, composite, parts);
  expect(done.ChecksumSHA256).toBe(`${sha(Buffer.concat(PARTS.map(sha))).toString('base64')}-3`);

  const whole = await begin(client, { ChecksumAlgorithm: 'CRC64NVME' });
  const again = await upload(client, whole, PARTS, { ChecksumAlgorithm: 'CRC64NVME' });
  const zeros = Buffer.alloc(8).toString('base64');
  expect(await codeOf(complete(client, whole, again, { ChecksumCRC64NVME: zeros }))).toBe('BadDigest');
  await complete(client, whole, again);
  const put = await client.send(
    new PutObjectCommand({
      Bucket: BUCKET,
      Key: 'same',
      Body: Buffer.concat(PARTS),
      ChecksumAlgorithm: 'CRC64NVME',
    }),
  );
  const head = await client.send(new HeadObjectCommand({ ...at, ChecksumMode: 'ENABLED' }));
  expect([head.ChecksumCRC64NVME, head.ChecksumType]).toEqual([put.ChecksumCRC64NVME, 'FULL_OBJECT']);
  expect(await codeOf(begin(client, { ChecksumAlgorithm: 'SHA256', ChecksumType: 'FULL_OBJECT' }))).toBe(
    'InvalidRequest',
  );
});
