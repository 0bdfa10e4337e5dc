import { checkStorage } from './checkStorage';
import { connect, type StorageConfig } from './client';
import { setRetention } from './lock';
import type { Storage } from './port';
import { presignGet, presignPut } from './presign';
import { getBytes, getStream, head, list } from './read';
import { remove } from './remove';
import { seal } from './seal';
import { put } from './write';

export type { StorageConfig, StorageRequest } from './client';

/** Bellkeep's storage on any S3-compatible store. Nothing is sent before the first method is called. */
export function createS3Storage(config: StorageConfig): Storage {
  const connection = connect(config);
  const { run } = connection;
  const storage: Storage = {
    presignPut: (request) => run('presignPut', request.key, () => presignPut(connection, request)),
    presignGet: (request) => run('presignGet', request.key, () => presignGet(connection, request)),
    put: (request) => run('put', request.key, () => put(connection, request)),
    getStream: (key, range) => run('getStream', key, () => getStream(connection, key, range)),
    getBytes: (key, maxBytes) => run('getBytes', key, () => getBytes(connection, key, maxBytes)),
    head: (key) => run('head', key, () => head(connection, key)),
    seal: (request) => run('seal', request.to, () => seal(connection, request)),
    list: (prefix, options) => run('list', prefix, () => list(connection, prefix, options)),
    remove: (key) => run('remove', key, () => remove(connection, key)),
    setRetention: (key, untilMs) => run('setRetention', key, () => setRetention(connection, key, untilMs)),
    check: (prefix) => run('check', prefix, () => checkStorage(storage, connection, prefix)),
  };
  return storage;
}
