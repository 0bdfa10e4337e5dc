import type { z } from 'zod';
import type { UploadTarget } from '@/lib/contract/device';
import { NoAnswer, retryAfterOf, ServiceProblem } from './answers';
import type { Device } from './device';

const PUT_TIMEOUT_MS = 300_000;
/** Lost to another writer for now (409, conditional write), or asked to come back. */
const AGAIN = new Set([408, 409, 425, 429]);

/**
 * Put the bytes to storage, exactly as the slot says, without any credential.
 *
 * @throws NoAnswer when it may be tried again as it is; ServiceProblem `slot-ended` when a fresh slot is needed
 */
export async function putBytes(
  device: Pick<Device, 'fetch' | 'origin'>,
  target: z.infer<typeof UploadTarget>,
  bytes: Uint8Array,
): Promise<void> {
  // fetch computes Content-Length from the body itself and refuses to be told.
  const headers = Object.fromEntries(
    Object.entries(target.headers).filter(
      ([name]) => !['content-length', 'host'].includes(name.toLowerCase()),
    ),
  );
  let response: Response;
  try {
    response = await device.fetch(target.url, {
      method: target.method,
      headers,
      body: bytes as Uint8Array<ArrayBuffer>,
      redirect: 'manual',
      signal: AbortSignal.timeout(PUT_TIMEOUT_MS),
    });
    await response.arrayBuffer();
  } catch (cause) {
    throw new NoAnswer('storage gave no answer', { cause });
  }
  // Precondition failed: bytes of an earlier try are there. Whether they are the right ones, completing tells.
  if (response.ok || response.status === 412) return;
  const retryAfterMs = retryAfterOf(response.headers);
  if (response.status >= 500 || AGAIN.has(response.status))
    throw new NoAnswer(`storage answered ${response.status}`, { retryAfterMs });
  throw new ServiceProblem(
    response.status,
    {
      type: `${device.origin}/problems/slot-ended`,
      title: 'Storage refused the upload',
      status: response.status,
    },
    retryAfterMs,
  );
}
