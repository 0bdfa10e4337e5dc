import { Readable } from 'node:stream';
import { Refusal } from '@/lib/platform/errors';
import { type Storage, StorageError } from '@/lib/storage/port';

/**
 * An object of the store as an answer of ours. What people's browsers get is never sniffed and never shown as a page:
 * a recording may be a page in disguise.
 */
export async function streamObject(
  storage: Storage,
  key: string,
  headers: Record<string, string>,
): Promise<Response> {
  const object = await fromStorage(() => storage.getStream(key));
  return new Response(Readable.toWeb(Readable.from(object.body)) as ReadableStream<Uint8Array>, {
    headers: {
      'content-length': String(object.contentLength),
      'x-content-type-options': 'nosniff',
      'content-security-policy': "default-src 'none'; sandbox",
      'cross-origin-resource-policy': 'same-origin',
      ...headers,
    },
  });
}

/** What is asked of the store, with its failures as refusals. @throws Refusal `not-found`, `storage-unavailable` */
export async function fromStorage<T>(ask: () => Promise<T>): Promise<T> {
  try {
    return await ask();
  } catch (error) {
    if (!(error instanceof StorageError)) throw error;
    throw new Refusal(
      error.code === 'not-found' ? 'not-found' : 'storage-unavailable',
      undefined,
      {},
      { cause: error, headers: { 'retry-after': '2' } },
    );
  }
}
