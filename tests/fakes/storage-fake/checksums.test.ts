import { createHash } from 'node:crypto';
import { Readable } from 'node:stream';
import {
  type ChecksumAlgorithm,
  GetObjectAttributesCommand,
  GetObjectCommand,
  HeadObjectCommand,
  PutObjectCommand,
} from '@aws-sdk/client-s3';
import { expect, test } from 'vitest';
import { crc32, crc32c, crc64nvme, type Running } from '@/storage-fake/crc';
import { BUCKET, clientFor, codeOf, fakeForTest } from './support';

const hex = (running: Running, ...pieces: Uint8Array[]): string => {
  for (const piece of pieces) running.update(piece);
  return running.digest().toString('hex');
};

// Check values over "123456789" from the catalogue of parametrised CRC algorithms (CRC-32/ISO-HDLC, CRC-32/ISCSI,
// CRC-64/NVME), from memory; CRC-32C of 32 zero bytes and of 0..31 from RFC 3720, B.4 (there low byte first).
test('the check values of the three CRCs come out', () => {
  const digits = Buffer.from('123456789');
  expect(hex(crc32(), digits)).toBe('cbf43926');
  expect(hex(crc32c(), digits)).toBe('e3069283');
  expect(hex(crc64nvme(), digits)).toBe('ae8b14860a799888');
  expect(hex(crc32c(), Buffer.alloc(32))).toBe('8a9136aa');
  expect(hex(crc32c(), Buffer.from(Array.from({ length: 32 }, (_, i) => i)))).toBe('46dd794e');
});

test('a CRC does not depend on how the bytes were cut', () => {
  const bytes = Buffer.from(Array.from({ length: 1000 }, (_, i) => (i * 7) & 0xff));
  for (const make of [crc32, crc32c, crc64nvme]) {
    const whole = hex(make(), bytes);
    for (const at of [0, 1, 7, 8, 9, 500, 999])
      expect(hex(make(), bytes.subarray(0, at), bytes.subarray(at))).toBe(whole);
  }
});

const body = Buffer.from('a recording of 16 bytes or so');
const sha256 = createHash('sha256').update(body).digest('base64');
const sha1 = createHash('sha1').update(body).digest('base64');

test('a checksum in a header is verified, kept and given back where it is asked for', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  const put = (checksum: object) =>
    client.send(new PutObjectCommand({ Bucket: BUCKET, Key: 'k', Body: body, ...checksum }));
  const zeros = (bytes: number) => Buffer.alloc(bytes).toString('base64');
  for (const wrong of [
    { ChecksumSHA256: zeros(32) },
    { ChecksumSHA1: zeros(20) },
    { ChecksumCRC32: zeros(4) },
    { ChecksumCRC32C: zeros(4) },
    { ChecksumCRC64NVME: zeros(8) },
    { ContentMD5: zeros(16) },
  ]) {
    expect([wrong, await codeOf(put(wrong))]).toEqual([wrong, 'BadDigest']);
  }
  expect(await codeOf(put({ ChecksumSHA256: zeros(31) }))).toBe('InvalidRequest');
  expect(await codeOf(put({ ChecksumSHA256: sha256, ChecksumSHA1: sha1 }))).toBe('InvalidRequest');
  expect(await codeOf(put({ ContentMD5: 'AAAA' }))).toBe('InvalidDigest');
  expect(fake.backdoor.keys(BUCKET)).toEqual([]);

  expect((await put({ ChecksumSHA256: sha256 })).ChecksumSHA256).toBe(sha256);
  const asked = await client.send(
    new HeadObjectCommand({ Bucket: BUCKET, Key: 'k', ChecksumMode: 'ENABLED' }),
  );
  expect(asked.ChecksumSHA256).toBe(sha256);
  const unasked = await client.send(new HeadObjectCommand({ Bucket: BUCKET, Key: 'k' }));
  expect(unasked.ChecksumSHA256).toBeUndefined();
  const range = await client.send(
    new GetObjectCommand({ Bucket: BUCKET, Key: 'k', Range: 'bytes=0-3', ChecksumMode: 'ENABLED' }),
  );
  expect(range.ChecksumSHA256).toBeUndefined();
  const attributes = await client.send(
    new GetObjectAttributesCommand({
      Bucket: BUCKET,
      Key: 'k',
      ObjectAttributes: ['Checksum', 'ObjectSize'],
    }),
  );
  expect([attributes.Checksum?.ChecksumSHA256, attributes.ObjectSize]).toEqual([sha256, body.length]);
});

test.each(['CRC32', 'CRC32C', 'CRC64NVME', 'SHA1', 'SHA256'] as ChecksumAlgorithm[])(
  "the %s that AWS's client computes is the one the store computes",
  async (algorithm) => {
    const client = clientFor(await fakeForTest());
    await client.send(
      new PutObjectCommand({ Bucket: BUCKET, Key: 'k', Body: body, ChecksumAlgorithm: algorithm }),
    );
    const head = await client.send(
      new HeadObjectCommand({ Bucket: BUCKET, Key: 'k', ChecksumMode: 'ENABLED' }),
    );
    expect(head[`Checksum${algorithm}` as keyof typeof head]).toBeDefined();
  },
);

// By default AWS's client sends a stream in chunks with an unsigned trailing checksum.
test('a stream with a trailing checksum is stored, and `aws-chunked` is not part of what it is', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake, {
    requestChecksumCalculation: 'WHEN_SUPPORTED',
    responseChecksumValidation: 'WHEN_SUPPORTED',
  });
  const pieces = Array.from({ length: 50 }, (_, i) => Buffer.alloc(10_000, i));
  const bytes = Buffer.concat(pieces);
  await client.send(
    new PutObjectCommand({
      Bucket: BUCKET,
      Key: 'k',
      Body: Readable.from(pieces),
      ContentLength: bytes.length,
      ContentEncoding: 'gzip',
    }),
  );
  const got = await client.send(new GetObjectCommand({ Bucket: BUCKET, Key: 'k' }));
  expect(got.ContentEncoding).toBe('gzip');
  expect(Buffer.compare(Buffer.from((await got.Body?.transformToByteArray()) ?? []), bytes)).toBe(0);
});

test('a store that does not take trailers answers 501, and the same client without them is served', async () => {
  const fake = await fakeForTest({ refuseStreamedTrailers: true });
  const put = () =>
    new PutObjectCommand({
      Bucket: BUCKET,
      Key: 'k',
      Body: Readable.from([body]),
      ContentLength: body.length,
    });
  expect(await codeOf(clientFor(fake, { requestChecksumCalculation: 'WHEN_SUPPORTED' }).send(put()))).toBe(
    'NotImplemented',
  );
  expect(await codeOf(clientFor(fake).send(put()))).toBeUndefined();
});

test('a store that carries checksums unseen stores other bytes and repeats the claim', async () => {
  const client = clientFor(await fakeForTest({ ignoreSignedChecksum: true }));
  const claim = Buffer.alloc(32, 7).toString('base64');
  await client.send(new PutObjectCommand({ Bucket: BUCKET, Key: 'k', Body: body, ChecksumSHA256: claim }));
  const head = await client.send(
    new HeadObjectCommand({ Bucket: BUCKET, Key: 'k', ChecksumMode: 'ENABLED' }),
  );
  expect(head.ChecksumSHA256).toBe(claim);
});
