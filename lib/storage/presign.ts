import { GetObjectCommand, PutObjectCommand } from '@aws-sdk/client-s3';
import { getSignedUrl } from '@aws-sdk/s3-request-presigner';
import type { Connection } from './client';
import { attachmentDisposition } from './disposition';
import type { Presigned, PresignGet, PresignPut } from './port';

/** What the signature of an upload covers: change one and it no longer matches. */
const SIGNED = ['host', 'content-type', 'content-length', 'x-amz-checksum-sha256', 'if-none-match'];

const signingDate = (nowMs: number | undefined) =>
  nowMs === undefined ? {} : { signingDate: new Date(nowMs) };

/**
 * A presigned PUT for exactly these bytes. Length, type, SHA-256 and `If-None-Match: *` are signed headers, so that
 * the store refuses other bytes and a second use; a store that does not verify a signed SHA-256 still holds the
 * length and the type, and the reader must hash again.
 */
export async function presignPut(
  { publicClient, bucket }: Connection,
  request: PresignPut,
): Promise<Presigned & { method: 'PUT' }> {
  const { key, contentLength, contentType, sha256, expiresSeconds, nowMs } = request;
  if (sha256.length !== 32) throw new Error('a SHA-256 has 32 bytes');
  const checksum = Buffer.from(sha256).toString('base64');
  const command = new PutObjectCommand({
    Bucket: bucket,
    Key: key,
    ContentLength: contentLength,
    ContentType: contentType,
    ChecksumSHA256: checksum,
    IfNoneMatch: '*',
  });
  const url = await getSignedUrl(publicClient, command, {
    expiresIn: expiresSeconds,
    signableHeaders: new Set(SIGNED),
    unhoistableHeaders: new Set(['x-amz-checksum-sha256']),
    ...signingDate(nowMs),
  });
  return {
    url,
    method: 'PUT',
    headers: {
      'content-type': contentType,
      'content-length': String(contentLength),
      'x-amz-checksum-sha256': checksum,
      'if-none-match': '*',
    },
  };
}

/** A presigned GET that is saved, never shown, whatever the bytes are. */
export async function presignGet(
  { publicClient, bucket }: Connection,
  request: PresignGet,
): Promise<Presigned & { method: 'GET' }> {
  const command = new GetObjectCommand({
    Bucket: bucket,
    Key: request.key,
    ResponseContentDisposition: attachmentDisposition(request.filename),
    ResponseContentType: request.contentType,
    ResponseCacheControl: 'private, no-store',
  });
  const url = await getSignedUrl(publicClient, command, {
    expiresIn: request.expiresSeconds,
    ...signingDate(request.nowMs),
  });
  return { url, method: 'GET', headers: {} };
}
