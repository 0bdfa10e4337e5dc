import { S3Error } from './errors';
import type { S3Request } from './request';
import { authenticateSigV2, isSigV2 } from './sigv2';
import {
  ALGORITHM,
  type Credentials,
  canonicalRequest,
  type Scope,
  sameSignature,
  sign,
  signingKey,
  stringToSign,
} from './sigv4';

const SKEW_MS = 15 * 60_000;
const EXPIRES_SECONDS_MAX = 7 * 24 * 3600;
const UNSIGNED = 'UNSIGNED-PAYLOAD';

/** What the chunk signatures of a streamed body chain to. */
export interface ChunkChain {
  key: Buffer;
  amzDate: string;
  scope: Scope;
  seedSignature: string;
}

/** How the body is bound to the signature. */
export type PayloadBinding =
  | { kind: 'unsigned' }
  | { kind: 'sha256'; hex: string }
  | { kind: 'chunked'; trailer: boolean; chain?: ChunkChain };

interface Parts {
  accessKey: string;
  scope: Scope;
  amzDate: string;
  atMs: number;
  signedHeaders: string[];
  signature: string;
  payloadHash: string;
}

/**
 * Verify who sent a request. Nothing of the body has been read; what is returned says how it must be checked.
 *
 * @throws S3Error with S3's own code for each way to be wrong
 */
export function authenticate(request: S3Request, credentials: Credentials, nowMs: number): PayloadBinding {
  if (isSigV2(request)) {
    authenticateSigV2(request, credentials, nowMs);
    return { kind: 'unsigned' };
  }
  const presigned = request.has('X-Amz-Algorithm') || request.has('X-Amz-Signature');
  const authorization = request.header('authorization');
  if (presigned && authorization !== undefined) {
    throw new S3Error('InvalidArgument', 'Only one auth mechanism allowed');
  }
  if (!presigned && authorization === undefined) throw new S3Error('AccessDenied', 'Access Denied');
  const parts = presigned
    ? partsOfQuery(request, nowMs)
    : partsOfHeader(request, authorization as string, nowMs);
  checkScope(parts, credentials, presigned);
  checkSignedHeaders(request, parts.signedHeaders);
  const canonical = canonicalRequest(request, parts.signedHeaders, parts.payloadHash);
  const text = stringToSign(parts.amzDate, parts.scope, canonical);
  const key = signingKey(credentials.secretKey, parts.scope);
  if (!sameSignature(sign(key, text), parts.signature)) {
    throw new S3Error(
      'SignatureDoesNotMatch',
      'The request signature we calculated does not match the signature you provided. Check your key and signing method.',
      { AWSAccessKeyId: parts.accessKey, StringToSign: text, CanonicalRequest: canonical },
    );
  }
  return bindingOf(parts, key);
}

function partsOfHeader(request: S3Request, authorization: string, nowMs: number): Parts {
  const malformed = (why: string) =>
    new S3Error('AuthorizationHeaderMalformed', `The authorization header is malformed; ${why}`);
  if (!authorization.startsWith(`${ALGORITHM} `)) {
    throw new S3Error(
      'InvalidRequest',
      `The authorization mechanism you have provided is not supported. Please use ${ALGORITHM}.`,
    );
  }
  const fields = new Map<string, string>();
  for (const field of authorization.slice(ALGORITHM.length + 1).split(',')) {
    const at = field.indexOf('=');
    if (at > 0) fields.set(field.slice(0, at).trim(), field.slice(at + 1).trim());
  }
  const [credential, signedHeaders, signature] = ['Credential', 'SignedHeaders', 'Signature'].map((name) =>
    fields.get(name),
  );
  if (!credential || !signedHeaders || !signature)
    throw malformed('Credential, SignedHeaders and Signature are needed.');
  const time = timeOf(request.header('x-amz-date'), request.header('date'));
  if (time === undefined) {
    throw new S3Error('AccessDenied', 'AWS authentication requires a valid Date or x-amz-date header');
  }
  if (Math.abs(time.atMs - nowMs) > SKEW_MS) {
    throw new S3Error(
      'RequestTimeTooSkewed',
      'The difference between the request time and the current time is too large.',
      {
        RequestTime: time.amzDate,
        ServerTime: new Date(nowMs).toISOString(),
        MaxAllowedSkewMilliseconds: String(SKEW_MS),
      },
    );
  }
  const payloadHash = request.header('x-amz-content-sha256');
  if (payloadHash === undefined) {
    throw new S3Error('InvalidRequest', 'Missing required header for this request: x-amz-content-sha256');
  }
  const parsed = parseCredential(credential);
  if (parsed === undefined) throw malformed('the Credential is not ACCESS/DAY/REGION/s3/aws4_request.');
  return { ...parsed, ...time, signedHeaders: signedHeaders.split(';'), signature, payloadHash };
}

function partsOfQuery(request: S3Request, nowMs: number): Parts {
  const wrong = (message: string) => new S3Error('AuthorizationQueryParametersError', message);
  const [algorithm, credential, date, expires, signedHeaders, signature] = [
    'X-Amz-Algorithm',
    'X-Amz-Credential',
    'X-Amz-Date',
    'X-Amz-Expires',
    'X-Amz-SignedHeaders',
    'X-Amz-Signature',
  ].map((name) => request.query.get(name));
  if (!algorithm || !credential || !date || !expires || !signedHeaders || !signature) {
    throw wrong(
      'Query-string authentication version 4 requires the X-Amz-Algorithm, X-Amz-Credential, X-Amz-Signature, X-Amz-Date, X-Amz-SignedHeaders, and X-Amz-Expires parameters.',
    );
  }
  if (algorithm !== ALGORITHM) throw wrong(`X-Amz-Algorithm only supports "${ALGORITHM}"`);
  const parsed = parseCredential(credential);
  if (parsed === undefined) throw wrong('Error parsing the X-Amz-Credential parameter.');
  const time = timeOf(date, undefined);
  if (time === undefined)
    throw wrong("X-Amz-Date must be in the ISO8601 Long Format \"yyyyMMdd'T'HHmmss'Z'\"");
  if (!/^\d{1,10}$/.test(expires)) throw wrong('X-Amz-Expires should be a number');
  const lifeSeconds = Number(expires);
  if (lifeSeconds > EXPIRES_SECONDS_MAX) {
    throw wrong(
      `X-Amz-Expires must be less than a week (in seconds); that is, the given X-Amz-Expires must be less than ${EXPIRES_SECONDS_MAX} seconds`,
    );
  }
  if (time.atMs > nowMs + SKEW_MS) throw new S3Error('AccessDenied', 'Request is not yet valid');
  const endMs = time.atMs + lifeSeconds * 1000;
  if (nowMs > endMs) {
    throw new S3Error('AccessDenied', 'Request has expired', {
      'X-Amz-Expires': expires,
      Expires: new Date(endMs).toISOString(),
      ServerTime: new Date(nowMs).toISOString(),
    });
  }
  // A signer that binds the body says so in a parameter or a signed header; else the body is not signed.
  const inQuery = [...request.query].find(([name]) => name.toLowerCase() === 'x-amz-content-sha256')?.[1];
  const payloadHash = inQuery ?? request.header('x-amz-content-sha256') ?? UNSIGNED;
  return { ...parsed, ...time, signedHeaders: signedHeaders.split(';'), signature, payloadHash };
}

function parseCredential(text: string): { accessKey: string; scope: Scope } | undefined {
  const match = /^(.+)\/(\d{8})\/([^/]+)\/([^/]+)\/aws4_request$/.exec(text);
  if (match === null) return undefined;
  const [, accessKey, day, region, service] = match as unknown as [string, string, string, string, string];
  return { accessKey, scope: { day, region, service } };
}

/** `YYYYMMDDTHHMMSSZ`, or the Date header in a form of RFC 9110, 5.6.7. */
function timeOf(
  amzDate: string | undefined,
  date: string | undefined,
): { amzDate: string; atMs: number } | undefined {
  const match = /^(\d{4})(\d\d)(\d\d)T(\d\d)(\d\d)(\d\d)Z$/.exec(amzDate ?? '');
  if (match !== null) {
    const [year, month, day, hour, minute, second] = match.slice(1).map(Number) as [
      number,
      number,
      number,
      number,
      number,
      number,
    ];
    return { amzDate: amzDate as string, atMs: Date.UTC(year, month - 1, day, hour, minute, second) };
  }
  const atMs = Date.parse(amzDate ?? date ?? '');
  if (Number.isNaN(atMs)) return undefined;
  return { amzDate: `${new Date(atMs).toISOString().replace(/[-:]|\.\d{3}/g, '')}`, atMs };
}

function checkScope(parts: Parts, credentials: Credentials, presigned: boolean): void {
  const wrong = (why: string, extra: Record<string, string> = {}) =>
    presigned
      ? new S3Error(
          'AuthorizationQueryParametersError',
          `Error parsing the X-Amz-Credential parameter; ${why}`,
          extra,
        )
      : new S3Error('AuthorizationHeaderMalformed', `The authorization header is malformed; ${why}`, extra);
  if (!sameSignature(parts.accessKey, credentials.accessKey)) {
    throw new S3Error(
      'InvalidAccessKeyId',
      'The AWS Access Key Id you provided does not exist in our records.',
      {
        AWSAccessKeyId: parts.accessKey,
      },
    );
  }
  const { day, region, service } = parts.scope;
  if (service !== 's3') throw wrong(`incorrect service "${service}". This endpoint belongs to "s3".`);
  if (region !== credentials.region) {
    throw wrong(`the region '${region}' is wrong; expecting '${credentials.region}'`, {
      Region: credentials.region,
    });
  }
  if (day !== parts.amzDate.slice(0, 8)) throw wrong(`the day '${day}' is not that of the request.`);
}

/** The host and every `x-amz-` header that a request carries must be covered by its signature. */
function checkSignedHeaders(request: S3Request, signedHeaders: readonly string[]): void {
  const signed = new Set(signedHeaders);
  const missing = request.headers
    .map(([name]) => name)
    .filter((name) => (name === 'host' || name.startsWith('x-amz-')) && !signed.has(name));
  if (missing.length === 0) return;
  throw new S3Error('AccessDenied', 'There were headers present in the request which were not signed', {
    HeadersNotSigned: missing.join(', '),
  });
}

function bindingOf(parts: Parts, key: Buffer): PayloadBinding {
  const chain: ChunkChain = {
    key,
    amzDate: parts.amzDate,
    scope: parts.scope,
    seedSignature: parts.signature,
  };
  switch (parts.payloadHash) {
    case UNSIGNED:
      return { kind: 'unsigned' };
    case 'STREAMING-AWS4-HMAC-SHA256-PAYLOAD':
      return { kind: 'chunked', trailer: false, chain };
    case 'STREAMING-AWS4-HMAC-SHA256-PAYLOAD-TRAILER':
      return { kind: 'chunked', trailer: true, chain };
    case 'STREAMING-UNSIGNED-PAYLOAD-TRAILER':
      return { kind: 'chunked', trailer: true };
  }
  if (!/^[0-9a-f]{64}$/.test(parts.payloadHash)) {
    throw new S3Error(
      'InvalidArgument',
      'x-amz-content-sha256 must be UNSIGNED-PAYLOAD, STREAMING-UNSIGNED-PAYLOAD-TRAILER, STREAMING-AWS4-HMAC-SHA256-PAYLOAD, STREAMING-AWS4-HMAC-SHA256-PAYLOAD-TRAILER, or a valid sha256 value.',
      { ArgumentName: 'x-amz-content-sha256' },
    );
  }
  return { kind: 'sha256', hex: parts.payloadHash };
}
