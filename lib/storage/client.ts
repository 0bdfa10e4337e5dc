import { S3Client } from '@aws-sdk/client-s3';
import { toStorageError } from './errors';

export interface StorageConfig {
  /** `http(s)://host[:port]` as this process reaches the store. */
  endpoint: string;
  region: string;
  bucket: string;
  accessKeyId: string;
  secretAccessKey: string;
  forcePathStyle: boolean;
  /** The store's address in presigned requests, where devices and browsers see another one. */
  publicEndpoint?: string;
  /** Told after each request; carries no address and no secret. */
  onRequest?: (request: StorageRequest) => void;
  /** UTC milliseconds, by which a retention is still to come or already over. */
  nowMs?: () => number;
  /** How patient to be; the defaults suit a route that somebody waits for. */
  patience?: { connectMilliseconds?: number; idleMilliseconds?: number; attempts?: number };
}

export interface StorageRequest {
  operation: string;
  key: string;
  /** `ok` or the code of the StorageError. */
  outcome: string;
  milliseconds: number;
}

const CONNECT_MS = 2000;
const IDLE_MS = 15_000;
const ATTEMPTS = 3;

export interface Connection {
  client: S3Client;
  /** For presigning only: it makes no requests. */
  publicClient: S3Client;
  bucket: string;
  nowMs: () => number;
  /** Run one operation: measured, and with every failure as a StorageError. */
  run<T>(operation: string, key: string, work: () => Promise<T>): Promise<T>;
}

/** @param config see StorageConfig; nothing is sent yet */
export function connect(config: StorageConfig): Connection {
  const { patience = {}, onRequest } = config;
  const clientAt = (endpoint: string): S3Client =>
    new S3Client({
      endpoint,
      region: config.region,
      forcePathStyle: config.forcePathStyle,
      credentials: { accessKeyId: config.accessKeyId, secretAccessKey: config.secretAccessKey },
      // By default the SDK sends checksums in streamed trailers, which not every store takes, and signs the CRC of an
      // empty body into presigned addresses.
      requestChecksumCalculation: 'WHEN_REQUIRED',
      responseChecksumValidation: 'WHEN_REQUIRED',
      maxAttempts: patience.attempts ?? ATTEMPTS,
      requestHandler: {
        connectionTimeout: patience.connectMilliseconds ?? CONNECT_MS,
        socketTimeout: patience.idleMilliseconds ?? IDLE_MS,
      },
    });
  const client = clientAt(config.endpoint);
  return {
    client,
    publicClient: config.publicEndpoint === undefined ? client : clientAt(config.publicEndpoint),
    bucket: config.bucket,
    nowMs: config.nowMs ?? Date.now,
    async run(operation, key, work) {
      const began = performance.now();
      const report = (outcome: string): void =>
        onRequest?.({ operation, key, outcome, milliseconds: performance.now() - began });
      try {
        const result = await work();
        report('ok');
        return result;
      } catch (error) {
        const failure = toStorageError(error, operation, key);
        report(failure.code);
        throw failure;
      }
    },
  };
}
