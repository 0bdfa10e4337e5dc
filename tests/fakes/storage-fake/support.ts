import { mkdtempSync, rmSync } from 'node:fs';
import { type IncomingHttpHeaders, request } from 'node:http';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { S3Client, type S3ClientConfig } from '@aws-sdk/client-s3';
import { onTestFinished } from 'vitest';
import { type StorageFake, type StorageFakeOptions, startStorageFake } from '@/storage-fake/server';

export const KEYS = { accessKey: 'fake-access', secretKey: 'fake-secret-of-some-length' };
export const BUCKET = 'examplebucket';

/** A directory that is gone when the test is over. */
export function temporaryDirectory(): string {
  const dir = mkdtempSync(join(tmpdir(), 'bellkeep-storage-'));
  onTestFinished(() => rmSync(dir, { recursive: true, force: true }));
  return dir;
}

/** A running fake that is stopped when the test is over. */
export async function fakeForTest(options: Partial<StorageFakeOptions> = {}): Promise<StorageFake> {
  const fake = await startStorageFake({ dir: temporaryDirectory(), bucket: BUCKET, ...KEYS, ...options });
  onTestFinished(() => fake.close());
  return fake;
}

/** AWS's own client against the fake, without retries, so that a test sees the first answer. */
export function clientFor(fake: { url: string }, config: S3ClientConfig = {}): S3Client {
  const client = new S3Client({
    endpoint: fake.url,
    region: 'us-east-1',
    forcePathStyle: true,
    credentials: { accessKeyId: KEYS.accessKey, secretAccessKey: KEYS.secretKey },
    requestChecksumCalculation: 'WHEN_REQUIRED',
    responseChecksumValidation: 'WHEN_REQUIRED',
    maxAttempts: 1,
    ...config,
  });
  onTestFinished(() => client.destroy());
  return client;
}

export interface RawAnswer {
  status: number;
  headers: IncomingHttpHeaders;
  body: Buffer;
  /** Code of the error document, where there is one. */
  code: string | undefined;
}

export interface RawRequest {
  method: string;
  path: string;
  headers?: Record<string, string>;
  body?: Uint8Array;
}

/** Send exactly these header lines; nothing is added but what node:http must. */
export function send(port: number, { method, path, headers = {}, body }: RawRequest): Promise<RawAnswer> {
  return new Promise((resolve, reject) => {
    const outgoing = request({ port, host: '127.0.0.1', method, path, headers, agent: false }, (incoming) => {
      const pieces: Buffer[] = [];
      incoming.on('error', reject).on('data', (piece: Buffer) => pieces.push(piece));
      incoming.on('end', () => {
        const all = Buffer.concat(pieces);
        const code = /<Code>([^<]*)<\/Code>/.exec(all.toString('utf8'))?.[1];
        resolve({ status: incoming.statusCode ?? 0, headers: incoming.headers, body: all, code });
      });
    });
    outgoing.on('error', reject).end(body);
  });
}

/** Code of the error that a call of AWS's client ends with; undefined where it succeeds. */
export async function codeOf(call: Promise<unknown>): Promise<string | undefined> {
  try {
    await call;
    return undefined;
  } catch (error) {
    const { Code, name, $metadata } = error as {
      Code?: string;
      name: string;
      $metadata?: { httpStatusCode?: number };
    };
    // An answer without a body, such as 304, has no code.
    return Code ?? (name === 'Unknown' ? String($metadata?.httpStatusCode) : name);
  }
}
