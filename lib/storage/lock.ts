import { GetObjectLockConfigurationCommand, PutObjectRetentionCommand } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { toStorageError } from './errors';
import type { Lock } from './port';
import { head } from './read';

/** Whether the bucket has object lock. A store that does not know the question, or will not answer it, has none. */
export async function hasObjectLock({ client, bucket }: Connection): Promise<boolean> {
  try {
    const answer = await client.send(new GetObjectLockConfigurationCommand({ Bucket: bucket }));
    return answer.ObjectLockConfiguration?.ObjectLockEnabled === 'Enabled';
  } catch (error) {
    const { code } = toStorageError(error, 'check', '');
    if (code === 'unavailable' && !isNotImplemented(error)) throw error;
    if (code === 'timeout') throw error;
    return false;
  }
}

const statusOf = (error: unknown): number | undefined => toStorageError(error, '', '').status;

export const isNotImplemented = (error: unknown): boolean => statusOf(error) === 501;

/**
 * Whether a request with a lock was refused because there is no object lock here. Stores say it as 400 or 501, some
 * without a word of explanation, so the bucket is asked.
 */
export async function refusedForLackOfLock(connection: Connection, error: unknown): Promise<boolean> {
  const status = statusOf(error);
  if (status !== 400 && status !== 404 && status !== 501) return false;
  return !(await hasObjectLock(connection));
}

/** Stores keep the date in seconds or milliseconds. */
const wholeSeconds = (ms: number): number => Math.floor(ms / 1000);

/**
 * The lock that an object shows. What it was asked for is not believed: some stores take a lock's headers and do
 * nothing.
 */
export async function shownLock(connection: Connection, key: string, untilMs: number): Promise<Lock> {
  const found = await head(connection, key);
  const shown = found?.retainUntilMs;
  return shown !== undefined && wholeSeconds(shown) >= wholeSeconds(untilMs) ? 'compliance' : 'none';
}

/** @returns `none` where the store has no object lock */
export async function setRetention(connection: Connection, key: string, untilMs: number): Promise<Lock> {
  const { client, bucket } = connection;
  try {
    await client.send(
      new PutObjectRetentionCommand({
        Bucket: bucket,
        Key: key,
        Retention: { Mode: 'COMPLIANCE', RetainUntilDate: new Date(untilMs) },
        // The operation demands one, and the SDK's own choice is not known to every store.
        ChecksumAlgorithm: 'SHA256',
      }),
    );
  } catch (error) {
    if (await refusedForLackOfLock(connection, error)) return 'none';
    throw error;
  }
  return shownLock(connection, key, untilMs);
}
