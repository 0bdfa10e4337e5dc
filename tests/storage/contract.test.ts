import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { S3Client } from '@aws-sdk/client-s3';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { createS3Storage } from '@/lib/storage/s3';
import { startStorageFake } from '@/storage-fake/server';
import { describeStorageContract } from './contract';
import { probe, type StoreUnderTest } from './storeUnderTest';

// One suite. It runs on the fake, or, where the environment names a store, on that one instead:
// S3_ENDPOINT, S3_ACCESS_KEY_ID, S3_SECRET_ACCESS_KEY, S3_BUCKET and, if need be, S3_REGION.

const {
  S3_ENDPOINT,
  S3_ACCESS_KEY_ID,
  S3_SECRET_ACCESS_KEY,
  S3_BUCKET,
  S3_REGION = 'us-east-1',
} = process.env;
const real = S3_ENDPOINT && S3_ACCESS_KEY_ID && S3_SECRET_ACCESS_KEY && S3_BUCKET;

interface Address {
  endpoint: string;
  accessKeyId: string;
  secretAccessKey: string;
  bucket: string;
  close: () => Promise<void>;
}

async function address(): Promise<Address> {
  if (real) {
    const keys = { accessKeyId: S3_ACCESS_KEY_ID, secretAccessKey: S3_SECRET_ACCESS_KEY };
    return { endpoint: S3_ENDPOINT, ...keys, bucket: S3_BUCKET, close: async () => undefined };
  }
  const dir = mkdtempSync(join(tmpdir(), 'bellkeep-contract-'));
  const keys = { accessKey: 'contract', secretKey: 'contract-secret' };
  const fake = await startStorageFake({ dir, ...keys, bucket: 'contract-bucket' });
  const close = async () => {
    await fake.close();
    rmSync(dir, { recursive: true, force: true });
  };
  return {
    endpoint: fake.url,
    accessKeyId: keys.accessKey,
    secretAccessKey: keys.secretKey,
    bucket: 'contract-bucket',
    close,
  };
}

let store: StoreUnderTest;
let close: () => Promise<void>;

beforeAll(async () => {
  const { endpoint, accessKeyId, secretAccessKey, bucket, ...rest } = await address();
  const common = { endpoint, region: S3_REGION, forcePathStyle: true };
  const storage = createS3Storage({ ...common, bucket, accessKeyId, secretAccessKey });
  const client = new S3Client({
    ...common,
    credentials: { accessKeyId, secretAccessKey },
    requestChecksumCalculation: 'WHEN_REQUIRED',
    responseChecksumValidation: 'WHEN_REQUIRED',
  });
  const prefix = `contract-${Date.now()}/`;
  const found = { storage, client, bucket, prefix };
  store = { ...found, capabilities: await probe(found) };
  if (real) console.warn(`the store at ${endpoint} was found able to: ${JSON.stringify(store.capabilities)}`);
  close = async () => {
    client.destroy();
    await rest.close();
  };
});

afterAll(async () => {
  for (let after: string | undefined; ; ) {
    const page = await store.storage.list(store.prefix, after === undefined ? {} : { after });
    // What is still locked stays until its minutes are over.
    await Promise.all(page.entries.map(({ key }) => store.storage.remove(key).catch(() => undefined)));
    if (page.next === undefined) break;
    after = page.next;
  }
  await close();
});

test(`what ${real ? 'the store in the environment' : 'the fake'} can do is known`, async ({ annotate }) => {
  await annotate(JSON.stringify(store.capabilities));
  if (real) return;
  // The fake can do everything that Bellkeep uses; stores that cannot are in quirks.test.ts.
  expect(store.capabilities).toEqual({ verifiesSignedSha256: true, objectLock: true, conditionalPut: true });
});

describeStorageContract(real ? 'the store in the environment' : 'the fake', () => store);
