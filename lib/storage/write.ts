import { createHash } from 'node:crypto';
import { PutObjectCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { toStorageError } from './errors';
import { refusedForLackOfLock, shownLock } from './lock';
import type { Lock, Put } from './port';
import { head } from './read';

type Outcome = 'stored' | 'exists';

export async function put(connection: Connection, request: Put): Promise<{ outcome: Outcome; lock: Lock }> {
  // The condition on the write decides between two at once; the look before it serves stores that pass over the condition.
  if (request.ifAbsent && (await head(connection, request.key)) !== null)
    return { outcome: 'exists', lock: 'none' };
  const { retainUntilMs = 0 } = request;
  const retains = retainUntilMs > connection.nowMs();
  let locked = retains || request.legalHold === true;
  let outcome: Outcome;
  try {
    outcome = await send(connection, request, locked);
  } catch (error) {
    if (!locked || !(await refusedForLackOfLock(connection, error))) throw error;
    locked = false;
    outcome = await send(connection, request, locked);
  }
  const lock =
    outcome === 'stored' && locked && retains
      ? await shownLock(connection, request.key, retainUntilMs)
      : 'none';
  return { outcome, lock };
}

async function send(connection: Connection, request: Put, locked: boolean): Promise<Outcome> {
  const { client, bucket } = connection;
  const { key, body, retainUntilMs = 0, legalHold } = request;
  const sha256 = createHash('sha256').update(body).digest();
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
        ...(locked &&
          retainUntilMs > connection.nowMs() && {
            ObjectLockMode: 'COMPLIANCE',
            ObjectLockRetainUntilDate: new Date(retainUntilMs),
          }),
        ...(locked && legalHold && { ObjectLockLegalHoldStatus: 'ON' }),
      }),
    );
    return 'stored';
  } catch (error) {
    const failure = toStorageError(error, 'put', key);
    if (failure.code !== 'precondition' || !request.ifAbsent) throw error;
    // The answer to an earlier attempt may have been lost: then what stands there is ours.
    const attempts = (error as { $metadata?: { attempts?: number } }).$metadata?.attempts ?? 1;
    return attempts > 1 && (await isThere(connection, key, body, sha256)) ? 'stored' : 'exists';
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
