import { CopyObjectCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { StorageError, saysNoObjectLock, toStorageError } from './errors';
import type { Lock, Seal } from './port';
import { head } from './read';
import { setRetention } from './write';

interface Sealed {
  outcome: 'sealed' | 'already';
  lock: Lock;
  etag: string;
}

/**
 * Copy to the final key and lock, never replacing what stands there.
 *
 * The lock travels with the copy, so that there is no moment at which the final object exists unlocked. The source's
 * ETag is kept with the copy: a store may give the copy another one, and a later run must know it again.
 */
export async function seal(connection: Connection, request: Seal): Promise<Sealed> {
  const before = await standing(connection, request);
  if (before !== null) return before;
  let lock: Lock = 'compliance';
  try {
    lock = await copy(connection, request);
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
  if (made === null || made.contentLength !== request.contentLength) {
    throw new StorageError('bad-response', 'seal', request.to);
  }
  return { outcome: 'sealed', lock, etag: made.etag };
}

/** What is at the final key: null for nothing, otherwise our bytes with their lock made sure of, or an error. */
async function standing(connection: Connection, request: Seal): Promise<Sealed | null> {
  const found = await head(connection, request.to);
  if (found === null) return null;
  const same =
    found.contentLength === request.contentLength &&
    (found.etag === request.expectedEtag || found.sealedFrom === request.expectedEtag);
  if (!same) throw new StorageError('exists', 'seal', request.to);
  const locked = (found.retainUntilMs ?? 0) >= floorToSecond(request.retainUntilMs);
  const lock = locked ? 'compliance' : await setRetention(connection, request.to, request.retainUntilMs);
  return { outcome: 'already', lock, etag: found.etag };
}

/** Stores keep the date in seconds or milliseconds. */
const floorToSecond = (ms: number): number => Math.floor(ms / 1000) * 1000;

/**
 * Copy, leaving away what the store does not know: first the condition on the target, then the lock. Without the
 * condition the look at the target before is what protects it, and two runs copy the same bytes.
 */
async function copy({ client, bucket }: Connection, request: Seal): Promise<Lock> {
  const send = (condition: boolean, locked: boolean) =>
    client.send(
      new CopyObjectCommand({
        Bucket: bucket,
        Key: request.to,
        CopySource: `${bucket}/${request.from.split('/').map(encodeURIComponent).join('/')}`,
        CopySourceIfMatch: `"${request.expectedEtag}"`,
        IfNoneMatch: condition ? '*' : undefined,
        MetadataDirective: 'REPLACE',
        ContentType: request.contentType,
        Metadata: { 'sealed-from': request.expectedEtag },
        ChecksumAlgorithm: 'SHA256',
        ...(locked && {
          ObjectLockMode: 'COMPLIANCE',
          ObjectLockRetainUntilDate: new Date(request.retainUntilMs),
        }),
      }),
    );
  try {
    await send(true, true);
    return 'compliance';
  } catch (error) {
    if (!saysNoObjectLock(error)) throw error;
  }
  try {
    await send(true, false);
    return 'none';
  } catch (error) {
    if (toStorageError(error, 'seal', request.to).status !== 501) throw error;
  }
  try {
    await send(false, true);
    return 'compliance';
  } catch (error) {
    if (!saysNoObjectLock(error)) throw error;
  }
  await send(false, false);
  return 'none';
}
