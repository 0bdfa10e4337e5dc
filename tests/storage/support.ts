import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { onTestFinished } from 'vitest';
import type { Storage } from '@/lib/storage/port';
import { createS3Storage, type StorageConfig } from '@/lib/storage/s3';
import { type StorageFake, type StorageFakeOptions, startStorageFake } from '@/storage-fake/server';

export const BUCKET = 'bellkeep-test';
export const SECRET = 'a-secret-that-must-not-be-seen';

/** A port on a fake of its own, both gone when the test is over. */
export async function storageForTest(
  options: Partial<StorageFakeOptions> = {},
  config: Partial<StorageConfig> = {},
): Promise<{ storage: Storage; fake: StorageFake }> {
  const dir = mkdtempSync(join(tmpdir(), 'bellkeep-storage-'));
  const fake = await startStorageFake({
    dir,
    bucket: BUCKET,
    accessKey: 'test',
    secretKey: SECRET,
    ...options,
  });
  onTestFinished(async () => {
    await fake.close();
    rmSync(dir, { recursive: true, force: true });
  });
  const storage = createS3Storage({
    endpoint: fake.url,
    region: 'us-east-1',
    bucket: BUCKET,
    accessKeyId: 'test',
    secretAccessKey: SECRET,
    forcePathStyle: true,
    ...config,
  });
  return { storage, fake };
}
