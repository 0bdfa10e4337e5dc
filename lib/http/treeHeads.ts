import { publicKeyOf } from '@/lib/custody/heads/headKeys';
import { mailHeads } from '@/lib/custody/heads/mailHeads';
import { type HeadSigner, makeHead, STORE_HEAD } from '@/lib/custody/heads/makeHead';
import { reviveHeads, storeHead } from '@/lib/custody/heads/storeHead';
import { currentSigningKey, privateKeyOf } from '@/lib/keys/signingKeys';
import type { Handler } from '@/lib/platform/outbox';
import type { Services } from '@/lib/platform/services';

const HEADS_EVERY_MS = 60_000;

/** The key that signs heads now; the first call in a new house makes it. */
export async function headSigner(services: Services): Promise<HeadSigner> {
  const row = await currentSigningKey(services, 'tree-head');
  const key = await privateKeyOf(services, row);
  return {
    kid: row.kid,
    publicKey: publicKeyOf(row.publicJwk),
    sign: async (message) =>
      new Uint8Array(await crypto.subtle.sign('Ed25519', key, message as Uint8Array<ArrayBuffer>)),
  };
}

/** What the outbox does for heads, by kind. */
export const headWork = (services: Services): Record<string, Handler> => ({
  [STORE_HEAD]: (payload) => storeHead(services, payload),
});

/** Sign what was appended since the last head, and write to the auditors if it is a new day. */
export async function tendHeads(services: Services): Promise<void> {
  await makeHead(services, await headSigner(services));
  await mailHeads(services);
  await reviveHeads(services);
}

/** A head at least each minute in which something happened, from now on. @returns how to stop */
export function startHeads(services: Services): () => void {
  let running = false;
  const tick = async () => {
    if (running) return;
    running = true;
    try {
      await tendHeads(services);
    } catch (error) {
      services.log.error({ err: error }, 'no tree head could be made');
    } finally {
      running = false;
    }
  };
  void tick();
  const timer = setInterval(tick, HEADS_EVERY_MS);
  timer.unref();
  return () => clearInterval(timer);
}
