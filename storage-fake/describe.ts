import { CHECKSUM_NAMES, checksumHeader } from './checksums';
import { notImplemented, S3Error } from './errors';
import type { BucketExchange, Exchange } from './exchange';
import { defaultRetention, type Locked, parseLegalHold, parseRetention } from './locks';
import type { ObjectRecord } from './objects';

/** Headers that are kept with an object and come back with it. */
const KEPT = [
  'content-type',
  'cache-control',
  'content-disposition',
  'content-encoding',
  'content-language',
  'expires',
  'x-amz-storage-class',
  'x-amz-website-redirect-location',
  'x-amz-server-side-encryption',
];

const META_BYTES_MAX = 2048;

export interface Description extends Locked {
  system: Record<string, string>;
  meta: Record<string, string>;
  tags: Record<string, string>;
}

/**
 * What a request says about the object it is going to make: kept headers, user metadata, tags.
 *
 * @throws S3Error where it asks for something that this store does not do
 */
export function describeFrom(exchange: BucketExchange): Description {
  const { request } = exchange;
  const get = (name: string) => request.header(name);
  if (get('x-amz-server-side-encryption-customer-algorithm') !== undefined) throw notImplemented();
  if ((get('x-amz-server-side-encryption') ?? 'AES256') !== 'AES256') throw notImplemented();
  const acl = get('x-amz-acl') ?? 'private';
  if (acl !== 'private' && acl !== 'bucket-owner-full-control') {
    throw new S3Error('AccessControlListNotSupported', 'The bucket does not allow ACLs');
  }
  const system: Record<string, string> = {};
  for (const name of KEPT) {
    const value = get(name);
    if (value !== undefined) system[name] = value;
  }
  const encoding = withoutAwsChunked(system['content-encoding']);
  if (encoding === undefined) delete system['content-encoding'];
  else system['content-encoding'] = encoding;
  if (system['x-amz-storage-class'] === 'STANDARD') delete system['x-amz-storage-class'];
  system['content-type'] ??= 'binary/octet-stream';
  const meta = Object.fromEntries(request.headersWith('x-amz-meta-'));
  const metaBytes = Object.entries(meta).reduce((sum, [name, value]) => sum + name.length + value.length, 0);
  if (metaBytes > META_BYTES_MAX) {
    throw new S3Error('MetadataTooLarge', 'Your metadata headers exceed the maximum allowed metadata size', {
      Size: String(metaBytes),
      MaxSizeAllowed: String(META_BYTES_MAX),
    });
  }
  const tags = Object.fromEntries(new URLSearchParams(get('x-amz-tagging') ?? ''));
  return { system, meta, tags, ...lockFrom(exchange) };
}

/** `aws-chunked` is how the body travelled, not what it is. */
function withoutAwsChunked(encoding: string | undefined): string | undefined {
  const rest = (encoding ?? '')
    .split(',')
    .map((one) => one.trim())
    .filter((one) => one !== '' && one !== 'aws-chunked');
  return rest.length === 0 ? undefined : rest.join(',');
}

/** @throws S3Error where the store or the bucket has no object lock */
export function assertLockable(exchange: BucketExchange): void {
  if (exchange.behaviour.objectLock === 'unknown') throw notImplemented();
  if (exchange.behaviour.objectLock === 'absent' || !exchange.bucket.record.objectLock) {
    throw new S3Error('InvalidRequest', 'Bucket is missing Object Lock Configuration');
  }
}

function lockFrom(exchange: BucketExchange): Locked {
  const { request, bucket } = exchange;
  const [mode, until, hold] = ['mode', 'retain-until-date', 'legal-hold'].map((name) =>
    request.header(`x-amz-object-lock-${name}`),
  );
  if (mode === undefined && until === undefined && hold === undefined) {
    const lockable = exchange.behaviour.objectLock === 'present' && bucket.record.objectLock;
    return {
      retention: lockable ? defaultRetention(bucket.record.defaultRetention, exchange.nowMs()) : undefined,
    };
  }
  assertLockable(exchange);
  if ((mode === undefined) !== (until === undefined)) {
    throw new S3Error(
      'InvalidArgument',
      'x-amz-object-lock-retain-until-date and x-amz-object-lock-mode must both be supplied',
    );
  }
  return {
    retention: mode === undefined ? undefined : parseRetention(mode, until, exchange.nowMs()),
    legalHold: hold === undefined ? undefined : parseLegalHold(hold),
  };
}

/** A put that locks must say what it puts, so that no broken object is locked. */
export function assertIntegrityDeclared(exchange: Exchange): void {
  const { request } = exchange;
  const locks = request.headersWith('x-amz-object-lock-').size > 0;
  const names = ['content-md5', 'x-amz-trailer', ...CHECKSUM_NAMES.map(checksumHeader)];
  if (!locks || names.some((name) => request.header(name) !== undefined)) return;
  throw new S3Error(
    'InvalidRequest',
    'Content-MD5 OR x-amz-checksum- HTTP header is required for Put Object requests with Object Lock parameters',
  );
}

export const httpDate = (ms: number): string => new Date(ms).toUTCString();
export const isoDate = (ms: number): string => new Date(ms).toISOString();
export const quoted = (etag: string): string => `"${etag}"`;

/** Headers by which an object is described to a reader. */
export function headersOf(
  record: ObjectRecord,
  withChecksums: boolean,
): Record<string, string | number | undefined> {
  const headers: Record<string, string | number | undefined> = {
    'accept-ranges': 'bytes',
    etag: quoted(record.etag),
    'last-modified': httpDate(record.modifiedMs),
    ...record.system,
  };
  for (const [name, value] of Object.entries(record.meta)) headers[`x-amz-meta-${name}`] = value;
  const tags = Object.keys(record.tags).length;
  if (tags > 0) headers['x-amz-tagging-count'] = tags;
  if (record.retention !== undefined) {
    headers['x-amz-object-lock-mode'] = record.retention.mode;
    headers['x-amz-object-lock-retain-until-date'] = isoDate(record.retention.untilMs);
  }
  if (record.legalHold !== undefined)
    headers['x-amz-object-lock-legal-hold'] = record.legalHold ? 'ON' : 'OFF';
  if (withChecksums) Object.assign(headers, checksumHeaders(record));
  return headers;
}

export function checksumHeaders(
  record: Pick<ObjectRecord, 'checksums' | 'checksumType'>,
): Record<string, string | undefined> {
  const entries = CHECKSUM_NAMES.flatMap((name) => {
    const value = record.checksums[name];
    return value === undefined ? [] : [[checksumHeader(name), value] as const];
  });
  return entries.length === 0
    ? {}
    : { ...Object.fromEntries(entries), 'x-amz-checksum-type': record.checksumType };
}
