import { startOutbox } from '@/lib/platform/outbox';
import type { Services } from '@/lib/platform/services';
import { deliverWebhook } from '@/lib/webhooks/deliver';
import { DELIVERY, fanOut } from '@/lib/webhooks/fanOut';

const EVERY_MS = 2_000;

/**
 * Tell other systems what happens, from now on. Deliveries have a line of their own through the outbox: a receiver that
 * is slow keeps no mail waiting. @returns how to stop
 */
export function startWebhooks(services: Services): () => void {
  const stopOutbox = startOutbox(
    services,
    { [DELIVERY]: (payload) => deliverWebhook(services, payload) },
    { only: DELIVERY },
  );
  let running = false;
  const timer = setInterval(async () => {
    if (running) return;
    running = true;
    try {
      while ((await fanOut(services)) > 0);
    } catch (error) {
      services.log.error({ err: error }, 'what happened could not be told to webhooks');
    } finally {
      running = false;
    }
  }, EVERY_MS);
  timer.unref();
  return () => {
    clearInterval(timer);
    stopOutbox();
  };
}
