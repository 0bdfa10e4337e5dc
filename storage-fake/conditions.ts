import { noSuchKey, notImplemented, preconditionFailed } from './errors';
import type { ObjectRecord } from './objects';

type Get = (name: string) => string | undefined;

const unquote = (etag: string): string => etag.trim().replace(/^(?:W\/)?"?|"?$/g, '');

/** True where an If-Match or If-None-Match list names the etag (RFC 9110, 13.1.1). */
const names = (list: string, etag: string): boolean =>
  list.trim() === '*' || list.split(',').some((one) => unquote(one) === etag);

const secondsOf = (ms: number): number => Math.floor(ms / 1000);

/**
 * Preconditions of a read, in the order of RFC 9110, 13.2.2.
 *
 * @param prefix `x-amz-copy-source-` where a copy asks about its source
 * @returns `unchanged` for 304
 * @throws S3Error PreconditionFailed
 */
export function checkReadConditions(get: Get, record: ObjectRecord, prefix = ''): 'send' | 'unchanged' {
  const match = get(`${prefix}if-match`);
  const since = get(`${prefix}if-unmodified-since`);
  if (match !== undefined) {
    if (!names(match, record.etag)) throw preconditionFailed('If-Match');
  } else if (since !== undefined && secondsOf(record.modifiedMs) > secondsOf(Date.parse(since))) {
    throw preconditionFailed('If-Unmodified-Since');
  }
  const noneMatch = get(`${prefix}if-none-match`);
  const modified = get(`${prefix}if-modified-since`);
  if (noneMatch !== undefined) return names(noneMatch, record.etag) ? 'unchanged' : 'send';
  if (modified !== undefined && secondsOf(record.modifiedMs) <= secondsOf(Date.parse(modified)))
    return 'unchanged';
  return 'send';
}

/**
 * Preconditions of a write ("Adding preconditions to S3 operations", Amazon S3 user guide): `If-None-Match: *` admits
 * only a new key, `If-Match` only the object that the writer has seen.
 *
 * @throws S3Error PreconditionFailed, NoSuchKey, NotImplemented
 */
export function checkWriteConditions(get: Get, key: string, current: ObjectRecord | undefined): void {
  const noneMatch = get('if-none-match');
  if (noneMatch !== undefined) {
    if (noneMatch.trim() !== '*') throw notImplemented();
    if (current !== undefined) throw preconditionFailed('If-None-Match');
  }
  const match = get('if-match');
  if (match === undefined) return;
  if (current === undefined) throw noSuchKey(key);
  if (!names(match, current.etag)) throw preconditionFailed('If-Match');
}
