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
  return {
    outcome: 'already',
    lock: await ensureLock(connection, request, found.retainUntilMs ?? 0),
    etag: found.etag,
  };
}

async function ensureLock(connection: Connection, request: Seal, untilMs: number): Promise<Lock> {
  if (untilMs > 0 && untilMs >= floorToSecond(request.retainUntilMs)) return 'compliance';
  if (request.retainUntilMs <= connection.nowMs()) return 'none';
  return setRetention(connection, request.to, request.retainUntilMs);
}

/** Stores keep the date in seconds or milliseconds. */
const floorToSecond = (ms: number): number => Math.floor(ms / 1000) * 1000;

/**
 * Copy, leaving away what the store does not know: first the lock, then the condition on the target. Without the
 * condition the look at the target before is what protects it, and two runs copy the same bytes.
 */
async function copy(connection: Connection, request: Seal): Promise<Lock> {
  const retains = request.retainUntilMs > connection.nowMs();
  const ways = [
    { condition: true, locked: true },
    { condition: true, locked: false },
    { condition: false, locked: true },
    { condition: false, locked: false },
  ].filter(({ locked }) => retains || !locked);
  for (const [i, way] of ways.entries()) {
    try {
      await sendCopy(connection, request, way);
      return way.locked ? 'compliance' : 'none';
    } catch (error) {
      if (i === ways.length - 1 || !saysUnknown(error)) throw error;
    }
  }
  throw new StorageError('bad-response', 'seal', request.to);
}

const saysUnknown = (error: unknown): boolean =>
  saysNoObjectLock(error) || toStorageError(error, 'seal', '').status === 501;

async function sendCopy(
  { client, bucket }: Connection,
  request: Seal,
  { condition, locked }: { condition: boolean; locked: boolean },
): Promise<void> {
  await client.send(
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
        ObjectLockMode: 'COMPLIANCE' as const,
        ObjectLockRetainUntilDate: new Date(request.retainUntilMs),
      }),
    }),
  );
}
