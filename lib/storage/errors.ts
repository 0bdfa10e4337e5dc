/** What can go wrong with the store, in words that callers decide by. */
export type StorageErrorCode =
  | 'not-found'
  | 'exists'
  | 'precondition'
  | 'denied'
  | 'locked'
  | 'unavailable'
  | 'timeout'
  | 'bad-response';

/**
 * A failure of the store. The message names the operation and the key, never an address or a credential; the cause
 * is a stripped copy of what the client library threw.
 */
export class StorageError extends Error {
  override readonly name = 'StorageError';
  constructor(
    readonly code: StorageErrorCode,
    readonly operation: string,
    readonly key: string,
    cause?: Error,
    /** HTTP status of the store's answer, where there was one. */
    readonly status?: number,
  ) {
    super(`storage ${operation}: ${code}`, cause === undefined ? undefined : { cause });
  }
}

interface Thrown {
  name?: string;
  Code?: string;
  message?: string;
  code?: string;
  cause?: unknown;
  $metadata?: { httpStatusCode?: number; requestId?: string };
}

const DENIED = new Set([
  'AccessDenied',
  'Forbidden',
  'SignatureDoesNotMatch',
  'InvalidAccessKeyId',
  'RequestTimeTooSkewed',
  'ExpiredToken',
]);
const NETWORK = new Set([
  'ECONNREFUSED',
  'ECONNRESET',
  'EPIPE',
  'ENOTFOUND',
  'EAI_AGAIN',
  'EHOSTUNREACH',
  'ENETUNREACH',
  'ERR_STREAM_PREMATURE_CLOSE',
]);

/** Turn whatever the client library threw into a StorageError; one that is one already passes through. */
export function toStorageError(error: unknown, operation: string, key: string): StorageError {
  if (error instanceof StorageError) return error;
  const thrown = (typeof error === 'object' && error !== null ? error : {}) as Thrown;
  return new StorageError(
    codeOf(thrown),
    operation,
    key,
    strippedCause(thrown),
    thrown.$metadata?.httpStatusCode,
  );
}

function codeOf(thrown: Thrown): StorageErrorCode {
  const status = thrown.$metadata?.httpStatusCode;
  const name = thrown.Code ?? thrown.name ?? '';
  if (isTimeout(thrown)) return 'timeout';
  if (status === 404 || name === 'NoSuchKey' || name === 'NotFound') return 'not-found';
  // 409: another conditional write to the same key was under way and has won.
  if (status === 412 || name === 'PreconditionFailed' || name === 'ConditionalRequestConflict')
    return 'precondition';
  if (/object lock|worm/i.test(thrown.message ?? '') && status === 403) return 'locked';
  if (status === 401 || status === 403 || DENIED.has(name)) return 'denied';
  if (status === 429 || (status !== undefined && status >= 500)) return 'unavailable';
  if (NETWORK.has(thrown.code ?? '') || NETWORK.has(name)) return 'unavailable';
  return 'bad-response';
}

function isTimeout(thrown: Thrown): boolean {
  return thrown.name === 'TimeoutError' || thrown.code === 'ETIMEDOUT' || thrown.name === 'AbortError';
}

/** The library's errors carry the response with the request in it, and with that signed addresses. */
function strippedCause(thrown: Thrown): Error {
  const name = thrown.Code ?? thrown.name ?? 'Error';
  const text = (thrown.message ?? '').replace(/https?:\/\/\S+/g, '[address]');
  const id = thrown.$metadata?.requestId;
  const cause = new Error(`${name}: ${text}${id === undefined ? '' : ` (request ${id})`}`);
  cause.name = name;
  return cause;
}
