import { createHash } from 'node:crypto';
import { DeleteObjectCommand, PutObjectCommand, PutObjectRetentionCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { StorageError, saysNoObjectLock, toStorageError } from './errors';
import type { Lock, Put } from './port';
import { head } from './read';

export async function put(
  connection: Connection,
  request: Put,
): Promise<{ outcome: 'stored' | 'exists'; lock: Lock }> {
  const retains = (request.retainUntilMs ?? 0) > connection.nowMs();
  const wantsLock = retains || request.legalHold === true;
  try {
    return await send(connection, request, wantsLock);
  } catch (error) {
    if (wantsLock && saysNoObjectLock(error)) return send(connection, request, false);
    throw error;
  }
}

async function send(
  connection: Connection,
  request: Put,
  locked: boolean,
): Promise<{ outcome: 'stored' | 'exists'; lock: Lock }> {
  const { client, bucket } = connection;
  const { key, body, retainUntilMs, legalHold } = request;
  const sha256 = createHash('sha256').update(body).digest();
  const lock: Lock = locked && (retainUntilMs ?? 0) > connection.nowMs() ? 'compliance' : 'none';
  try {
    await client.send(
      new PutObjectCommand({
        Bucket: bucket,
        Key: key,
        Body: body,
        ContentLength: body.length,
        ContentType: request.contentType,
        Metadata: request.metadata,
        ChecksumSHA256: sha256.toString('base64'),
        IfNoneMatch: request.ifAbsent ? '*' : undefined,
        ...(lock === 'compliance' && {
          ObjectLockMode: 'COMPLIANCE',
          ObjectLockRetainUntilDate: new Date(retainUntilMs as number),
        }),
        ...(locked && legalHold && { ObjectLockLegalHoldStatus: 'ON' }),
      }),
    );
    return { outcome: 'stored', lock };
  } catch (error) {
    const failure = toStorageError(error, 'put', key);
    if (failure.code !== 'precondition' || !request.ifAbsent) throw error;
    // The answer to an earlier attempt may have been lost: then what stands there is ours.
    const attempts = (error as { $metadata?: { attempts?: number } }).$metadata?.attempts ?? 1;
    if (attempts > 1 && (await isThere(connection, key, body, sha256))) return { outcome: 'stored', lock };
    return { outcome: 'exists', lock: 'none' };
  }
}

async function isThere(
  connection: Connection,
  key: string,
  body: Uint8Array,
  sha256: Buffer,
): Promise<boolean> {
  const found = await head(connection, key);
  if (found === null || found.contentLength !== body.length) return false;
  if (found.sha256 !== undefined) return sha256.equals(found.sha256);
  return found.etag === createHash('md5').update(body).digest('hex');
}

/** @throws StorageError `locked` also where the store only says that it is denied */
export async function remove(connection: Connection, key: string): Promise<void> {
  const { client, bucket } = connection;
  try {
    await client.send(new DeleteObjectCommand({ Bucket: bucket, Key: key }));
  } catch (error) {
    const failure = toStorageError(error, 'remove', key);
    if (failure.code === 'not-found') return;
    if (failure.code === 'denied') {
      const found = await head(connection, key).catch(() => null);
      if (found?.legalHold || (found?.retainUntilMs ?? 0) > connection.nowMs())
        throw new StorageError('locked', 'remove', key, failure);
    }
    throw error;
  }
}

/** @returns `none` where the store has no object lock */
export async function setRetention(
  { client, bucket }: Connection,
  key: string,
  untilMs: number,
): Promise<Lock> {
  try {
    await client.send(
      new PutObjectRetentionCommand({
        Bucket: bucket,
        Key: key,
        Retention: { Mode: 'COMPLIANCE', RetainUntilDate: new Date(untilMs) },
        // The store asks for one; without it the SDK would pick an algorithm of its own.
        ChecksumAlgorithm: 'SHA256',
      }),
    );
    return 'compliance';
  } catch (error) {
    if (saysNoObjectLock(error)) return 'none';
    throw error;
  }
}
