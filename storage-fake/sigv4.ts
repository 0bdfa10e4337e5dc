import { createHash, createHmac, timingSafeEqual } from 'node:crypto';
import { percentDecode, percentEncode, splitQuery } from './wire';

// Signature Version 4 ("Authenticating Requests: Using Query Parameters" and "Using the Authorization Header",
// Amazon S3 API reference). S3's own rules: the path is encoded once and never normalised.

export const ALGORITHM = 'AWS4-HMAC-SHA256';
export const EMPTY_SHA256 = 'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855';

/** The one pair of keys that the store knows, and the region it stands in. */
export interface Credentials {
  accessKey: string;
  secretKey: string;
  region: string;
}

/** A request as it stood on the wire; strings are latin1, a character a byte. */
export interface WireRequest {
  method: string;
  rawPath: string;
  rawQuery: string;
  headers: readonly (readonly [name: string, value: string])[];
}

/** `day/region/service/aws4_request` */
export interface Scope {
  day: string;
  region: string;
  service: string;
}

export const scopeText = (scope: Scope): string =>
  `${scope.day}/${scope.region}/${scope.service}/aws4_request`;

export const sha256Hex = (data: string | Uint8Array): string =>
  createHash('sha256')
    .update(typeof data === 'string' ? Buffer.from(data, 'latin1') : data)
    .digest('hex');

const hmac = (key: string | Uint8Array, text: string): Buffer =>
  createHmac('sha256', key).update(text, 'latin1').digest();

function canonicalQuery(rawQuery: string): string {
  return splitQuery(rawQuery)
    .map(({ name, value }) => [percentEncode(name), percentEncode(value)] as const)
    .filter(([name]) => name !== 'X-Amz-Signature')
    .sort(([a, x], [b, y]) => (a === b ? (x < y ? -1 : Number(x > y)) : a < b ? -1 : 1))
    .map(([name, value]) => `${name}=${value}`)
    .join('&');
}

/** Value of one header: duplicates joined by a comma, outer spaces cut, inner runs of spaces made one. */
export function canonicalHeader(headers: WireRequest['headers'], name: string): string | undefined {
  const values = headers.filter(([other]) => other.toLowerCase() === name).map(([, value]) => value);
  if (values.length === 0) return undefined;
  return values.map((value) => value.trim().replace(/ +/g, ' ')).join(',');
}

/**
 * Canonical request.
 *
 * @param signedHeaders lower-case names in the order the signer gave; one that the request lacks is signed as empty,
 *   which no honest signer does, so that the signature fails
 * @param payloadHash hexadecimal SHA-256, `UNSIGNED-PAYLOAD` or one of the `STREAMING-…` words
 */
export function canonicalRequest(
  request: WireRequest,
  signedHeaders: readonly string[],
  payloadHash: string,
): string {
  const headers = signedHeaders
    .map((name) => `${name}:${canonicalHeader(request.headers, name) ?? ''}\n`)
    .join('');
  return [
    request.method,
    percentEncode(percentDecode(request.rawPath), true),
    canonicalQuery(request.rawQuery),
    headers,
    signedHeaders.join(';'),
    payloadHash,
  ].join('\n');
}

export const stringToSign = (amzDate: string, scope: Scope, canonical: string): string =>
  [ALGORITHM, amzDate, scopeText(scope), sha256Hex(canonical)].join('\n');

/** 32-byte signing key of one day, region and service. */
export function signingKey(secret: string, scope: Scope): Buffer {
  const day = hmac(`AWS4${secret}`, scope.day);
  return hmac(hmac(hmac(day, scope.region), scope.service), 'aws4_request');
}

export const sign = (key: Uint8Array, text: string): string => hmac(key, text).toString('hex');

/** Signature of one chunk of `STREAMING-AWS4-HMAC-SHA256-PAYLOAD`; it chains to the one before. */
export const chunkStringToSign = (
  amzDate: string,
  scope: Scope,
  previous: string,
  chunkSha256: string,
): string =>
  [`${ALGORITHM}-PAYLOAD`, amzDate, scopeText(scope), previous, EMPTY_SHA256, chunkSha256].join('\n');

/** Signature of the trailing headers; `trailersSha256` is over `name:value\n` of each. */
export const trailerStringToSign = (
  amzDate: string,
  scope: Scope,
  previous: string,
  trailersSha256: string,
): string => [`${ALGORITHM}-TRAILER`, amzDate, scopeText(scope), previous, trailersSha256].join('\n');

/** Compare two signatures in time that does not depend on where they differ. */
export function sameSignature(a: string, b: string): boolean {
  const [x, y] = [Buffer.from(a, 'latin1'), Buffer.from(b, 'latin1')];
  return x.length === y.length && timingSafeEqual(x, y);
}
