import {
  CompleteMultipartUploadCommand,
  CopyObjectCommand,
  CreateBucketCommand,
  CreateMultipartUploadCommand,
  DeleteObjectCommand,
  DeleteObjectsCommand,
  GetObjectCommand,
  GetObjectLegalHoldCommand,
  GetObjectLockConfigurationCommand,
  GetObjectRetentionCommand,
  HeadObjectCommand,
  PutObjectCommand,
  type PutObjectCommandInput,
  PutObjectLegalHoldCommand,
  PutObjectLockConfigurationCommand,
  PutObjectRetentionCommand,
  UploadPartCommand,
} from '@aws-sdk/client-s3';
import { expect, test } from 'vitest';
import { BUCKET, clientFor, codeOf, fakeForTest } from './support';

const at = { Bucket: BUCKET, Key: 'k' };
const DAY_MS = 86_400_000;

test('of twenty conditional writes at once exactly one wins', async () => {
  const client = clientFor(await fakeForTest());
  const put = (i: number) =>
    client.send(new PutObjectCommand({ ...at, Body: `writer ${i}`, IfNoneMatch: '*' }));
  const codes = await Promise.all(Array.from({ length: 20 }, (_, i) => codeOf(put(i))));
  expect(codes.filter((code) => code === undefined)).toHaveLength(1);
  expect(codes.filter((code) => code === 'PreconditionFailed')).toHaveLength(19);
  const winner = codes.indexOf(undefined);
  const got = await client.send(new GetObjectCommand(at));
  expect(await got.Body?.transformToString()).toBe(`writer ${winner}`);
});

test('of several conditional completions and puts at once exactly one wins', async () => {
  const client = clientFor(await fakeForTest());
  const complete = async () => {
    const { UploadId } = await client.send(new CreateMultipartUploadCommand(at));
    const part = await client.send(new UploadPartCommand({ ...at, UploadId, PartNumber: 1, Body: 'part' }));
    const MultipartUpload = { Parts: [{ PartNumber: 1, ETag: part.ETag }] };
    return () =>
      codeOf(
        client.send(
          new CompleteMultipartUploadCommand({ ...at, UploadId, MultipartUpload, IfNoneMatch: '*' }),
        ),
      );
  };
  const ready = await Promise.all([complete(), complete(), complete()]);
  const put = () => codeOf(client.send(new PutObjectCommand({ ...at, Body: 'put', IfNoneMatch: '*' })));
  const codes = await Promise.all([...ready.map((run) => run()), put(), put()]);
  expect(codes.filter((code) => code === undefined)).toHaveLength(1);
  expect(codes.filter((code) => code === 'PreconditionFailed')).toHaveLength(4);
});

test('If-Match writes only over the object that was seen', async () => {
  const client = clientFor(await fakeForTest());
  const put = (Body: string, IfMatch?: string) => client.send(new PutObjectCommand({ ...at, Body, IfMatch }));
  expect(await codeOf(put('one', '"00000000000000000000000000000000"'))).toBe('NoSuchKey');
  const { ETag } = await put('one');
  expect(await codeOf(put('two', '"00000000000000000000000000000000"'))).toBe('PreconditionFailed');
  expect(await codeOf(put('two', ETag))).toBeUndefined();
});

test('reads keep their conditions', async () => {
  const client = clientFor(await fakeForTest());
  const { ETag } = await client.send(new PutObjectCommand({ ...at, Body: 'one' }));
  const get = (conditions: object) => codeOf(client.send(new GetObjectCommand({ ...at, ...conditions })));
  const [past, future] = [new Date(Date.now() - DAY_MS), new Date(Date.now() + DAY_MS)];
  expect(await get({ IfMatch: ETag })).toBeUndefined();
  expect(await get({ IfMatch: '"other"' })).toBe('PreconditionFailed');
  expect(await get({ IfNoneMatch: ETag })).toBe('304');
  expect(await get({ IfNoneMatch: '"other"' })).toBeUndefined();
  expect(await get({ IfModifiedSince: future })).toBe('304');
  expect(await get({ IfModifiedSince: past })).toBeUndefined();
  expect(await get({ IfUnmodifiedSince: past })).toBe('PreconditionFailed');
  // RFC 9110, 13.2.2: a date counts only where there is no tag.
  expect(await get({ IfMatch: ETag, IfUnmodifiedSince: past })).toBeUndefined();
  expect(await get({ IfNoneMatch: '"other"', IfModifiedSince: future })).toBeUndefined();
});

const retained = (untilMs: number): Partial<PutObjectCommandInput> => ({
  ObjectLockMode: 'COMPLIANCE',
  ObjectLockRetainUntilDate: new Date(untilMs),
  ChecksumAlgorithm: 'SHA256',
});

test('an object under compliance retention is neither overwritten nor removed, by any way, until its time is over', async () => {
  let now = Date.now();
  const client = clientFor(await fakeForTest({ nowMs: () => now }));
  await client.send(new PutObjectCommand({ ...at, Body: 'kept', ...retained(now + 60_000) }));
  await client.send(new PutObjectCommand({ ...at, Key: 'other', Body: 'other' }));
  expect(await codeOf(client.send(new PutObjectCommand({ ...at, Body: 'x' })))).toBe('AccessDenied');
  expect(await codeOf(client.send(new CopyObjectCommand({ ...at, CopySource: `${BUCKET}/other` })))).toBe(
    'AccessDenied',
  );
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBe('AccessDenied');
  expect(await codeOf(client.send(new DeleteObjectCommand({ ...at, BypassGovernanceRetention: true })))).toBe(
    'AccessDenied',
  );
  const several = await client.send(
    new DeleteObjectsCommand({
      Bucket: BUCKET,
      Delete: { Objects: [{ Key: 'k' }, { Key: 'other' }] },
      ChecksumAlgorithm: 'SHA256',
    }),
  );
  expect(several.Deleted?.map(({ Key }) => Key)).toEqual(['other']);
  expect(several.Errors?.map(({ Key, Code }) => [Key, Code])).toEqual([['k', 'AccessDenied']]);
  const { UploadId } = await client.send(new CreateMultipartUploadCommand(at));
  const part = await client.send(new UploadPartCommand({ ...at, UploadId, PartNumber: 1, Body: 'x' }));
  const MultipartUpload = { Parts: [{ PartNumber: 1, ETag: part.ETag }] };
  const complete = client.send(new CompleteMultipartUploadCommand({ ...at, UploadId, MultipartUpload }));
  expect(await codeOf(complete)).toBe('AccessDenied');
  now += 60_000;
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBeUndefined();
});

test('compliance retention is lengthened, never shortened or taken off', async () => {
  const client = clientFor(await fakeForTest());
  const now = Date.now();
  await client.send(new PutObjectCommand({ ...at, Body: 'kept', ...retained(now + 10 * DAY_MS) }));
  const retain = (Mode: 'COMPLIANCE' | 'GOVERNANCE', days: number) =>
    codeOf(
      client.send(
        new PutObjectRetentionCommand({
          ...at,
          Retention: { Mode, RetainUntilDate: new Date(now + days * DAY_MS) },
          BypassGovernanceRetention: true,
          ChecksumAlgorithm: 'SHA256',
        }),
      ),
    );
  expect(await retain('COMPLIANCE', 9)).toBe('AccessDenied');
  expect(await retain('GOVERNANCE', 20)).toBe('AccessDenied');
  expect(await retain('COMPLIANCE', -1)).toBe('InvalidArgument');
  expect(await retain('COMPLIANCE', 20)).toBeUndefined();
  const got = await client.send(new GetObjectRetentionCommand(at));
  expect(got.Retention?.RetainUntilDate?.getTime()).toBe(now + 20 * DAY_MS);
});

test('governance retention gives way only to who says so', async () => {
  const client = clientFor(await fakeForTest());
  await client.send(
    new PutObjectCommand({
      ...at,
      Body: 'kept',
      ...retained(Date.now() + DAY_MS),
      ObjectLockMode: 'GOVERNANCE',
    }),
  );
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBe('AccessDenied');
  expect(
    await codeOf(client.send(new DeleteObjectCommand({ ...at, BypassGovernanceRetention: true }))),
  ).toBeUndefined();
});

test('a legal hold keeps an object until it is taken off', async () => {
  const client = clientFor(await fakeForTest());
  await client.send(new PutObjectCommand({ ...at, Body: 'kept' }));
  expect(await codeOf(client.send(new GetObjectLegalHoldCommand(at)))).toBe('NoSuchObjectLockConfiguration');
  const hold = (Status: 'ON' | 'OFF') =>
    client.send(new PutObjectLegalHoldCommand({ ...at, LegalHold: { Status }, ChecksumAlgorithm: 'SHA256' }));
  await hold('ON');
  expect((await client.send(new HeadObjectCommand(at))).ObjectLockLegalHoldStatus).toBe('ON');
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBe('AccessDenied');
  await hold('OFF');
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBeUndefined();
});

test('a put that locks must declare its bytes, its mode and its date', async () => {
  const client = clientFor(await fakeForTest());
  const put = (lock: object) => codeOf(client.send(new PutObjectCommand({ ...at, Body: 'x', ...lock })));
  const until = new Date(Date.now() + DAY_MS);
  expect(await put({ ObjectLockMode: 'COMPLIANCE', ObjectLockRetainUntilDate: until })).toBe(
    'InvalidRequest',
  );
  expect(await put({ ObjectLockMode: 'COMPLIANCE', ChecksumAlgorithm: 'SHA256' })).toBe('InvalidArgument');
  expect(await put({ ...retained(Date.now() - 1000) })).toBe('InvalidArgument');
});

test('a bucket may give every new object a retention', async () => {
  const client = clientFor(await fakeForTest());
  await client.send(
    new PutObjectLockConfigurationCommand({
      Bucket: BUCKET,
      ObjectLockConfiguration: {
        ObjectLockEnabled: 'Enabled',
        Rule: { DefaultRetention: { Mode: 'COMPLIANCE', Days: 2 } },
      },
      ChecksumAlgorithm: 'SHA256',
    }),
  );
  const kept = await client.send(new GetObjectLockConfigurationCommand({ Bucket: BUCKET }));
  expect(kept.ObjectLockConfiguration?.Rule?.DefaultRetention).toEqual({ Mode: 'COMPLIANCE', Days: 2 });
  await client.send(new PutObjectCommand({ ...at, Body: 'kept' }));
  expect(await codeOf(client.send(new DeleteObjectCommand(at)))).toBe('AccessDenied');
});

test('a bucket made without object lock, and a store without it, say so in their own way', async () => {
  const fake = await fakeForTest();
  const client = clientFor(fake);
  await client.send(new CreateBucketCommand({ Bucket: 'plain-bucket' }));
  const put = (Bucket: string, using = client) =>
    codeOf(
      using.send(new PutObjectCommand({ Bucket, Key: 'k', Body: 'x', ...retained(Date.now() + DAY_MS) })),
    );
  expect(await put('plain-bucket')).toBe('InvalidRequest');
  expect(await put(BUCKET, clientFor(await fakeForTest({ noObjectLock: true })))).toBe('InvalidRequest');
  const unknowing = clientFor(await fakeForTest({ noObjectLock: 'not-implemented' }));
  expect(await put(BUCKET, unknowing)).toBe('NotImplemented');
  expect(await codeOf(unknowing.send(new GetObjectLockConfigurationCommand({ Bucket: BUCKET })))).toBe(
    'NotImplemented',
  );
});
