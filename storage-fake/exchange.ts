import type { IncomingMessage, ServerResponse } from 'node:http';
import type { PayloadBinding } from './authenticate';
import type { MetFaults } from './faults';
import type { Bucket, ObjectStore } from './objects';
import type { S3Request } from './request';

/** How the store behaves; fixed while it runs. */
export interface Behaviour {
  /** Carry a checksum header without looking at the bytes, as some real clusters do. */
  ignoreSignedChecksum: boolean;
  /** Pass over conditions on writes and on the source of a copy, as some real clusters do. */
  ignoreWriteConditions: boolean;
  /** Answer 501 to bodies with trailing headers. */
  refuseStreamedTrailers: boolean;
  /** `absent`: buckets have no lock configuration (400); `unknown`: the store does not know the operations (501). */
  objectLock: 'present' | 'absent' | 'unknown';
  allowedOrigins: readonly string[];
  region: string;
}

/** One request that was authenticated, and what is needed to answer it. */
export interface Exchange {
  message: IncomingMessage;
  response: ServerResponse;
  request: S3Request;
  requestId: string;
  binding: PayloadBinding;
  store: ObjectStore;
  behaviour: Behaviour;
  faults: MetFaults;
  nowMs: () => number;
  sendContinue: () => void;
}

/** A request about a bucket that exists. */
export interface BucketExchange extends Exchange {
  bucket: Bucket;
}

/** A request about a key in a bucket that exists. */
export interface KeyExchange extends BucketExchange {
  key: string;
}
