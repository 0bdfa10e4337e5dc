import { createHash, randomUUID } from 'node:crypto';
import type { S3Client } from '@aws-sdk/client-s3';
import type { Presigned, Put, Storage } from '@/lib/storage/port';

/** A store under test, and what it was found able to do. */
export interface StoreUnderTest {
  storage: Storage;
  /** AWS's own client, for what the port does not do. */
  client: S3Client;
  bucket: string;
  /** Everything a run writes lies under this prefix. */
  prefix: string;
  capabilities: Capabilities;
}

export interface Capabilities {
  /** The store compares a signed SHA-256 with the bytes. */
  verifiesSignedSha256: boolean;
  objectLock: boolean;
  /** A PUT with `If-None-Match: *` is refused where there is something. */
  conditionalPut: boolean;
}

export const sha256 = (bytes: Uint8Array): Buffer => createHash('sha256').update(bytes).digest();

/** Send bytes by a presigned address, as a device does. */
export async function putBy(
  presigned: Presigned,
  body: Uint8Array,
  change: Record<string, string> = {},
): Promise<number> {
  const headers: Record<string, string> = { ...presigned.headers, ...change };
  // fetch sets the length itself, from the body.
  delete headers['content-length'];
  const answer = await fetch(presigned.url, {
    method: presigned.method,
    headers,
    body: new Uint8Array(body),
  });
  await answer.arrayBuffer();
  return answer.status;
}

/**
 * Find out what the store can do, by doing it.
 *
 * @returns capabilities; each is also reported by a test of its own
 */
export async function probe(store: Omit<StoreUnderTest, 'capabilities'>): Promise<Capabilities> {
  const { storage, prefix } = store;
  const presign = (body: Uint8Array, key: string) =>
    storage.presignPut({
      key,
      contentLength: body.length,
      contentType: 'audio/wav',
      sha256: sha256(body),
      expiresSeconds: 60,
    });
  const [said, sent] = [Buffer.from('said'), Buffer.from('sent')];
  const lying = await putBy(await presign(said, `${prefix}probe-${randomUUID()}`), sent);
  const twice = await presign(said, `${prefix}probe-${randomUUID()}`);
  await putBy(twice, said);
  const { objectLock } = await storage.check(prefix);
  return {
    verifiesSignedSha256: lying >= 400,
    conditionalPut: (await putBy(twice, said)) === 412,
    objectLock,
  };
}

export async function collect(body: AsyncIterable<Uint8Array>): Promise<Buffer> {
  const pieces: Uint8Array[] = [];
  for await (const piece of body) pieces.push(piece);
  return Buffer.concat(pieces);
}

/** Keys of a test's own, and a short way to put. */
export function writersFor(get: () => StoreUnderTest) {
  return {
    key: (part = 'k') => `${get().prefix}${randomUUID()}/${part}`,
    store: (at: string, body: Uint8Array | string, more: Partial<Put> = {}) =>
      get().storage.put({ key: at, body: Buffer.from(body), contentType: 'audio/wav', ...more }),
  };
}
