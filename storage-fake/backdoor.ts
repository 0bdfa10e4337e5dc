import { writeFile } from 'node:fs/promises';
import type { ObjectStore } from './objects';

/**
 * What somebody with the store's disks in hand can do, past every lock and signature: for tests that look whether
 * an audit notices.
 */
export interface Backdoor {
  /** Put other bytes behind a key; its record (ETag, length, checksums, lock) stays as it was. */
  replaceBytes(bucket: string, key: string, bytes: Uint8Array): Promise<void>;
  /** Remove an object, locked or not. */
  remove(bucket: string, key: string): Promise<void>;
  /** Take retention and legal hold away. */
  unlock(bucket: string, key: string): Promise<void>;
  keys(bucket: string): string[];
}

export function openBackdoor(store: ObjectStore): Backdoor {
  const existing = (name: string, key: string) => {
    const bucket = store.bucket(name);
    const record = bucket.index.get(key);
    if (record === undefined) throw new Error(`no object ${key}`);
    return { bucket, record };
  };
  return {
    async replaceBytes(name, key, bytes) {
      const { record } = existing(name, key);
      await writeFile(store.blobPath(record.blob), bytes);
    },
    async remove(name, key) {
      const { bucket } = existing(name, key);
      await store.remove(bucket, key, () => undefined);
    },
    async unlock(name, key) {
      const { bucket, record } = existing(name, key);
      await store.commit(bucket, key, (current) => ({
        ...(current ?? record),
        retention: undefined,
        legalHold: undefined,
      }));
    },
    keys: (name) => [...store.bucket(name).index.values()].map(({ key }) => key),
  };
}
