import { GetObjectCommand, HeadObjectCommand, ListObjectsV2Command } from '@aws-sdk/client-s3';
import type { Connection } from './client';
import { StorageError, toStorageError } from './errors';
import type { Head, ListPage, Opened } from './port';

/** Without its quotes. */
export const plainEtag = (etag: string | undefined): string => (etag ?? '').replace(/^(?:W\/)?"|"$/g, '');

export async function head(
  { client, bucket }: Connection,
  key: string,
): Promise<(Head & { versionId?: string }) | null> {
  try {
    const found = await client.send(
      new HeadObjectCommand({ Bucket: bucket, Key: key, ChecksumMode: 'ENABLED' }),
    );
    // A checksum over parts' checksums ends in their number and says nothing about the whole.
    const whole = found.ChecksumSHA256 !== undefined && !found.ChecksumSHA256.includes('-');
    return {
      contentLength: found.ContentLength ?? 0,
      etag: plainEtag(found.ETag),
      contentType: found.ContentType ?? 'application/octet-stream',
      ...(whole ? { sha256: Buffer.from(found.ChecksumSHA256 as string, 'base64') } : {}),
      ...(found.ObjectLockRetainUntilDate
        ? { retainUntilMs: found.ObjectLockRetainUntilDate.getTime() }
        : {}),
      ...(found.ObjectLockLegalHoldStatus ? { legalHold: found.ObjectLockLegalHoldStatus === 'ON' } : {}),
      ...(found.VersionId ? { versionId: found.VersionId } : {}),
    };
  } catch (error) {
    if (toStorageError(error, 'head', key).code === 'not-found') return null;
    throw error;
  }
}

function rangeHeader(range: { from?: number; to?: number }): string | undefined {
  if (range.from === undefined && range.to === undefined) return undefined;
  return `bytes=${range.from ?? 0}-${range.to ?? ''}`;
}

export async function getStream(
  { client, bucket }: Connection,
  key: string,
  range: { from?: number; to?: number } = {},
): Promise<Opened> {
  const found = await client.send(
    new GetObjectCommand({ Bucket: bucket, Key: key, Range: rangeHeader(range) }),
  );
  const contentLength = found.ContentLength ?? 0;
  if (found.Body === undefined) throw new StorageError('bad-response', 'getStream', key);
  return {
    body: counted(found.Body as AsyncIterable<Uint8Array>, contentLength, key),
    contentLength,
    contentType: found.ContentType ?? 'application/octet-stream',
    etag: plainEtag(found.ETag),
  };
}

/** A connection that is cut looks like an end to some readers: count. */
async function* counted(
  body: AsyncIterable<Uint8Array>,
  bytes: number,
  key: string,
): AsyncGenerator<Uint8Array> {
  let left = bytes;
  try {
    for await (const piece of body) {
      left -= piece.length;
      yield piece;
    }
  } catch (error) {
    const failure = toStorageError(error, 'getStream', key);
    throw failure.code === 'timeout'
      ? failure
      : new StorageError('bad-response', 'getStream', key, failure.cause as Error);
  }
  if (left !== 0) throw new StorageError('bad-response', 'getStream', key);
}

export async function getBytes(connection: Connection, key: string, maxBytes: number): Promise<Uint8Array> {
  const { body, contentLength } = await getStream(connection, key);
  const pieces: Uint8Array[] = [];
  // Leaving the loop early also ends the transfer.
  for await (const piece of body) {
    if (contentLength > maxBytes) throw new StorageError('bad-response', 'getBytes', key);
    pieces.push(piece);
  }
  return Buffer.concat(pieces);
}

const PAGE = 1000;

/** Keys travel percent-encoded, since XML has no room for some characters; some stores write a space as a plus sign. */
const decodeKey = (key: string): string => decodeURIComponent(key.replaceAll('+', ' '));

export async function list(
  { client, bucket }: Connection,
  prefix: string,
  { after, limit = PAGE }: { after?: string; limit?: number } = {},
): Promise<ListPage> {
  const page = await client.send(
    new ListObjectsV2Command({
      Bucket: bucket,
      Prefix: prefix,
      StartAfter: after,
      MaxKeys: Math.min(limit, PAGE),
      EncodingType: 'url',
    }),
  );
  const decode = page.EncodingType === 'url' ? decodeKey : (key: string) => key;
  const entries = (page.Contents ?? []).map((entry) => ({
    key: decode(entry.Key ?? ''),
    contentLength: entry.Size ?? 0,
    etag: plainEtag(entry.ETag),
    modifiedMs: entry.LastModified?.getTime() ?? 0,
  }));
  return { entries, next: page.IsTruncated ? entries.at(-1)?.key : undefined };
}
