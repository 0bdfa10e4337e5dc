export { StorageError } from './errors';

/** A presigned request: whoever holds it may make it. It is a secret and is never logged. */
export interface Presigned {
  url: string;
  method: 'PUT' | 'GET';
  /** Headers that must be sent exactly so. */
  headers: Record<string, string>;
}

export interface PresignPut {
  key: string;
  contentLength: number;
  contentType: string;
  /** 32 bytes. */
  sha256: Uint8Array;
  expiresSeconds: number;
  /** When it is signed, UTC milliseconds; now where left out. */
  nowMs?: number;
}

export interface PresignGet {
  key: string;
  expiresSeconds: number;
  /** Name under which a browser saves it; any text. */
  filename: string;
  contentType: string;
  nowMs?: number;
}

export interface Put {
  key: string;
  body: Uint8Array;
  contentType: string;
  /** Write only where there is nothing yet. */
  ifAbsent?: boolean;
  /**
   * UTC milliseconds until which nobody may remove or replace it. Passed over where it is over already or the store
   * has no object lock.
   */
  retainUntilMs?: number;
  legalHold?: boolean;
  /** Printable ASCII. */
  metadata?: Record<string, string>;
}

export interface Opened {
  body: AsyncIterable<Uint8Array>;
  /** Bytes that will come: those of the range, where one was asked for. */
  contentLength: number;
  contentType: string;
  etag: string;
}

export interface Head {
  contentLength: number;
  etag: string;
  contentType: string;
  /** 32 bytes, where the store keeps a SHA-256 over the whole object. */
  sha256?: Uint8Array;
  retainUntilMs?: number;
  legalHold?: boolean;
}

export type Lock = 'compliance' | 'none';

export interface Seal {
  from: string;
  to: string;
  /** A time that is over already asks for no lock. */
  retainUntilMs: number;
  contentType: string;
  /** Of the object at `from`, as `head` or `getStream` gave it: other bytes are not sealed. */
  expectedEtag: string;
  contentLength: number;
  /** 32 bytes. Needed only on stores that give a copy a tag of its own: then the copy is read and hashed. */
  sha256?: Uint8Array;
}

export interface ListPage {
  entries: { key: string; contentLength: number; etag: string; modifiedMs: number }[];
  /** Give it as `after` for the next page; undefined at the end. */
  next: string | undefined;
}

export interface CheckStep {
  name: string;
  ok: boolean;
  detail: string;
}

export interface CheckReport {
  ok: boolean;
  steps: CheckStep[];
  objectLock: boolean;
}

/**
 * Bellkeep's view of an object store. Every method throws StorageError and nothing else; `key` is any text of up to
 * 1,024 bytes in UTF-8.
 */
export interface Storage {
  /** An address that admits exactly these bytes under this key, once, where nothing is there yet. */
  presignPut(request: PresignPut): Promise<Presigned & { method: 'PUT' }>;
  /** An address that serves the object as an attachment with its real type. */
  presignGet(request: PresignGet): Promise<Presigned & { method: 'GET' }>;
  /** `exists`: there was something already and `ifAbsent` was asked for. `lock` is what the store shows afterwards. */
  put(request: Put): Promise<{ outcome: 'stored' | 'exists'; lock: Lock }>;
  /**
   * Bytes `from` to `to`, both inclusive, zero-based.
   *
   * The stream fails with `bad-response` where it ends before `contentLength` bytes, and with `timeout` where nothing
   * passes for fifteen seconds, be it that the reader does not take it.
   */
  getStream(key: string, range?: { from?: number; to?: number }): Promise<Opened>;
  /** The whole object; `bad-response` where it is longer than `maxBytes`. */
  getBytes(key: string, maxBytes: number): Promise<Uint8Array>;
  head(key: string): Promise<Head | null>;
  /**
   * Copy an object inside the store to the key where it stays, and lock it there. Never replaces what stands there:
   * the same bytes are `already`, others are the error `exists`; `precondition` says that the source has changed.
   * Safe to repeat after any failure.
   *
   * Durable when it returns: the copy is at `to`; the object at `from` is left for the caller to remove. `lock` is
   * what the store shows, not what it was asked for.
   */
  seal(request: Seal): Promise<{ outcome: 'sealed' | 'already'; lock: Lock; etag: string }>;
  /** Keys in the order of their UTF-8 bytes. */
  list(prefix: string, options?: { after?: string; limit?: number }): Promise<ListPage>;
  /** With all its versions. One that is not there is no error; one that is locked is `locked`, and stays. */
  remove(key: string): Promise<void>;
  /** Lengthen the retention of an object. `none` where the store has no object lock. */
  setRetention(key: string, untilMs: number): Promise<Lock>;
  /** Put, read, list and remove a small object for real under `prefix`. */
  check(prefix: string): Promise<CheckReport>;
}
