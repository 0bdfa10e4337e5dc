import { createHmac } from 'node:crypto';
import { S3Error } from './errors';
import type { S3Request } from './request';
import { type Credentials, sameSignature } from './sigv4';

// Signature Version 2 ("Signing and authenticating REST requests", Amazon S3 developer guide). Some clients still
// presign with it by default in us-east-1, so it is verified rather than refused.

const SKEW_MS = 15 * 60_000;

/** Parameters that belong to the resource that is signed, in the guide's list. */
const SUBRESOURCES = new Set([
  'acl',
  'cors',
  'delete',
  'encryption',
  'lifecycle',
  'legal-hold',
  'location',
  'logging',
  'notification',
  'object-lock',
  'partNumber',
  'policy',
  'requestPayment',
  'retention',
  'tagging',
  'torrent',
  'uploadId',
  'uploads',
  'versionId',
  'versioning',
  'versions',
  'website',
  'response-cache-control',
  'response-content-disposition',
  'response-content-encoding',
  'response-content-language',
  'response-content-type',
  'response-expires',
]);

export const isSigV2 = (request: S3Request): boolean =>
  request.has('AWSAccessKeyId') || /^AWS [^ ]+:/.test(request.header('authorization') ?? '');

/** @throws S3Error where the signature, the key or the time is wrong */
export function authenticateSigV2(request: S3Request, credentials: Credentials, nowMs: number): void {
  const inQuery = request.query.get('AWSAccessKeyId');
  const header = /^AWS ([^ ]+):([^: ]+)$/.exec(request.header('authorization') ?? '');
  const accessKey = inQuery ?? header?.[1] ?? '';
  const signature = inQuery === undefined ? (header?.[2] ?? '') : (request.query.get('Signature') ?? '');
  if (!sameSignature(accessKey, credentials.accessKey)) {
    throw new S3Error(
      'InvalidAccessKeyId',
      'The AWS Access Key Id you provided does not exist in our records.',
    );
  }
  const date = inQuery === undefined ? dateOfHeader(request, nowMs) : dateOfQuery(request, nowMs);
  const text = [
    request.method,
    request.header('content-md5') ?? '',
    request.header('content-type') ?? '',
    date,
    `${amzHeaders(request)}${resourceOf(request)}`,
  ].join('\n');
  const expected = createHmac('sha1', credentials.secretKey).update(text, 'latin1').digest('base64');
  if (!sameSignature(expected, signature)) {
    throw new S3Error(
      'SignatureDoesNotMatch',
      'The request signature we calculated does not match the signature you provided. Check your key and signing method.',
      {
        AWSAccessKeyId: accessKey,
        StringToSign: text,
      },
    );
  }
}

function dateOfQuery(request: S3Request, nowMs: number): string {
  const expires = request.query.get('Expires') ?? '';
  if (!/^\d{1,12}$/.test(expires))
    throw new S3Error(
      'AccessDenied',
      'Query-string authentication requires the Signature, Expires and AWSAccessKeyId parameters',
    );
  if (nowMs > Number(expires) * 1000) throw new S3Error('AccessDenied', 'Request has expired');
  return expires;
}

function dateOfHeader(request: S3Request, nowMs: number): string {
  const amzDate = request.header('x-amz-date');
  const date = request.header('date') ?? '';
  const atMs = Date.parse(amzDate ?? date);
  if (Number.isNaN(atMs))
    throw new S3Error('AccessDenied', 'AWS authentication requires a valid Date or x-amz-date header');
  if (Math.abs(atMs - nowMs) > SKEW_MS) {
    throw new S3Error(
      'RequestTimeTooSkewed',
      'The difference between the request time and the current time is too large.',
    );
  }
  return amzDate === undefined ? date : '';
}

function amzHeaders(request: S3Request): string {
  const names = [...new Set(request.headers.map(([name]) => name))]
    .filter((name) => name.startsWith('x-amz-'))
    .sort();
  return names
    .map(
      (name) =>
        `${name}:${request.headers
          .filter(([other]) => other === name)
          .map(([, value]) => value.trim())
          .join(',')}\n`,
    )
    .join('');
}

function resourceOf(request: S3Request): string {
  const sent = request.virtualHost ? `/${request.bucket}${request.rawPath}` : request.rawPath;
  // A bucket is signed with a slash behind it, whether or not one was sent.
  const path = request.key === undefined && !sent.endsWith('/') ? `${sent}/` : sent;
  const parameters = [...request.query]
    .filter(([name]) => SUBRESOURCES.has(name))
    .sort(([a], [b]) => (a < b ? -1 : 1))
    .map(([name, value]) => (value === '' ? name : `${name}=${value}`));
  return parameters.length === 0 ? path : `${path}?${parameters.join('&')}`;
}
