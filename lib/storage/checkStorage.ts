import { randomUUID } from 'node:crypto';
import { PutObjectCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { toStorageError } from './errors';
import { hasObjectLock } from './lock';
import type { CheckReport, CheckStep, Storage } from './port';

/**
 * Do for real, with a small object under `prefix`, what Bellkeep needs of a store. Where nothing can be written the
 * other steps are not tried; otherwise each is, and the object is removed in any case.
 */
export async function checkStorage(
  storage: Storage,
  connection: Connection,
  prefix: string,
): Promise<CheckReport> {
  const key = `${prefix}check-${randomUUID()}`;
  const body = Buffer.from(`storage check ${key}\n`);
  const steps: CheckStep[] = [];
  const step = async (name: string, work: () => Promise<string>): Promise<void> => {
    if (steps[0]?.ok === false) {
      steps.push({ name, ok: false, detail: 'not tried' });
      return;
    }
    try {
      steps.push({ name, ok: true, detail: await work() });
    } catch (error) {
      const detail = error instanceof Unexpected ? error.message : toStorageError(error, name, key).code;
      steps.push({ name, ok: false, detail });
    }
  };
  await step('write', async () => {
    const { outcome } = await storage.put({ key, body, contentType: 'text/plain', ifAbsent: true });
    if (outcome !== 'stored') throw new Unexpected('a new key was said to exist');
    return `${body.length} bytes`;
  });
  await step('refuse to overwrite', async () => {
    // Past the port, which looks first: this is about the store.
    const { client, bucket } = connection;
    const again = new PutObjectCommand({ Bucket: bucket, Key: key, Body: body, IfNoneMatch: '*' });
    const code = await client.send(again).then(
      () => 'overwritten',
      (error: unknown) => toStorageError(error, 'put', key).code,
    );
    if (code === 'overwritten') throw new Unexpected('the store overwrote an object it was told to leave');
    if (code !== 'precondition') throw new Unexpected(code);
    return 'conditional writes are kept';
  });
  await step('read', async () => {
    const read = await storage.getBytes(key, 1024);
    if (!body.equals(read)) throw new Unexpected('other bytes came back');
    return 'the same bytes came back';
  });
  await step('list', async () => {
    const page = await storage.list(key);
    if (page.entries[0]?.key !== key) throw new Unexpected('the object is not in the listing');
    return 'the object is in the listing';
  });
  await step('remove', async () => {
    await storage.remove(key);
    if ((await storage.head(key)) !== null) throw new Unexpected('the object is still there');
    return 'the object is gone';
  });
  const written = steps[0]?.ok === true;
  return {
    ok: steps.every(({ ok }) => ok),
    steps,
    objectLock: written && (await hasObjectLock(connection).catch(() => false)),
  };
}

class Unexpected extends Error {}
