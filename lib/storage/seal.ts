import { createHash } from 'node:crypto';
import { CopyObjectCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { StorageError, toStorageError } from './errors';
import { isNotImplemented, setRetention } from './lock';
import type { Head, Lock, Seal } from './port';
import { getStream, head } from './read';
import { remove } from './remove';

interface Sealed {
  outcome: 'sealed' | 'already';
  lock: Lock;
  etag: string;
}

/**
 * Copy to the final key, look at what came of it, and lock it.
 *
 * The copy asks the store to take only the bytes that were looked at and to replace nothing. Some stores pass over
 * both, so what stands at the final key is compared before and after, and the lock, which cannot be taken back, comes
 * last. Died between copy and lock: the next call finds the copy and locks it.
 */
export async function seal(connection: Connection, request: Seal): Promise<Sealed> {
  const before = await standing(connection, request);
  if (before !== null) return before;
  try {
    await copy(connection, request);
  } catch (error) {
    const { code } = toStorageError(error, 'seal', request.to);
    // Refused for what stands there now, or the source is gone: another run may have sealed it in between.
    if (['precondition', 'locked', 'denied', 'not-found'].includes(code)) {
      const meanwhile = await standing(connection, request);
      if (meanwhile !== null) return meanwhile;
    }
    throw error;
  }
  const made = await head(connection, request.to);
  if (made === null) throw new StorageError('bad-response', 'seal', request.to);
  if (!(await isExpected(connection, request, made))) {
    await takeBack(connection, request, made);
    throw new StorageError('precondition', 'seal', request.to);
  }
  return { outcome: 'sealed', lock: await lockAt(connection, request, made), etag: made.etag };
}

/** What is at the final key: null for nothing, otherwise our bytes with their lock made sure of, or an error. */
async function standing(connection: Connection, request: Seal): Promise<Sealed | null> {
  const found = await head(connection, request.to);
  if (found === null) return null;
  if (!(await isExpected(connection, request, found))) throw new StorageError('exists', 'seal', request.to);
  return { outcome: 'already', lock: await lockAt(connection, request, found), etag: found.etag };
}

/** The same tag is the same bytes. Another tag may still be, where a store gives a copy its own: then they are hashed. */
async function isExpected(connection: Connection, request: Seal, found: Head): Promise<boolean> {
  if (found.contentLength !== request.contentLength) return false;
  if (found.etag === request.expectedEtag) return true;
  if (request.sha256 === undefined) return false;
  const hash = createHash('sha256');
  const { body } = await getStream(connection, request.to);
  for await (const piece of body) hash.update(piece);
  return hash.digest().equals(request.sha256);
}

/** Remove a copy of other bytes than were looked at, if it is certain that it was ours: it has the tag of the source. */
async function takeBack(connection: Connection, request: Seal, made: Head): Promise<void> {
  const source = await head(connection, request.from);
  if (source !== null && source.etag === made.etag) await remove(connection, request.to);
}

async function lockAt(connection: Connection, request: Seal, found: Head): Promise<Lock> {
  const shown = Math.floor((found.retainUntilMs ?? 0) / 1000);
  if (shown > 0 && shown >= Math.floor(request.retainUntilMs / 1000)) return 'compliance';
  if (request.retainUntilMs <= connection.nowMs()) return 'none';
  return setRetention(connection, request.to, request.retainUntilMs);
}

async function copy(connection: Connection, request: Seal): Promise<void> {
  try {
    await sendCopy(connection, request, '*');
  } catch (error) {
    if (!isNotImplemented(error)) throw error;
    // A store that does not know the condition on the target.
    await sendCopy(connection, request, undefined);
  }
}

async function sendCopy(
  { client, bucket }: Connection,
  request: Seal,
  ifNoneMatch: '*' | undefined,
): Promise<void> {
  await client.send(
    new CopyObjectCommand({
      Bucket: bucket,
      Key: request.to,
      CopySource: `${bucket}/${request.from.split('/').map(encodeURIComponent).join('/')}`,
      CopySourceIfMatch: `"${request.expectedEtag}"`,
      IfNoneMatch: ifNoneMatch,
      MetadataDirective: 'REPLACE',
      ContentType: request.contentType,
      ChecksumAlgorithm: 'SHA256',
    }),
  );
}
