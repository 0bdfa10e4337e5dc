import { DeleteObjectCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { StorageError, toStorageError } from './errors';
import { head } from './read';

/** So many versions of one key are removed in one call; more are nobody's doing but a fault. */
const VERSIONS_MAX = 50;

/**
 * Remove an object with all its versions. The lock is looked at first: a bucket that keeps versions would hide a
 * locked object behind a marker and answer that all is well.
 */
export async function remove(connection: Connection, key: string): Promise<void> {
  const { client, bucket } = connection;
  for (let round = 0; round < VERSIONS_MAX; round++) {
    const found = await head(connection, key);
    if (found === null) return;
    const locked = found.legalHold === true || (found.retainUntilMs ?? 0) > connection.nowMs();
    if (locked) throw new StorageError('locked', 'remove', key);
    const { versionId } = found;
    try {
      await client.send(new DeleteObjectCommand({ Bucket: bucket, Key: key, VersionId: versionId }));
    } catch (error) {
      if (toStorageError(error, 'remove', key).code !== 'not-found') throw error;
    }
    // Without versions there is nothing behind it.
    if (versionId === undefined) return;
  }
}
