import { retireSigningKeys } from '@/lib/keys/changeSigningKey';
import type { Services } from '@/lib/platform/services';
import { advanceRuns } from '@/lib/rotation/advanceRuns';

const ADVANCE_EVERY_MS = 2_000;
const RETIRE_EVERY_MS = 30_000;

/** Carry rotation runs on, and let signing keys go that nothing needs, from now on. @returns how to stop */
export function startRotation(services: Services): () => void {
  let running = false;
  let retireAt = 0;
  const timer = setInterval(async () => {
    if (running) return;
    running = true;
    try {
      while (await advanceRuns(services));
      if (services.clock.now() >= retireAt) {
        retireAt = services.clock.now() + RETIRE_EVERY_MS;
        await retireSigningKeys(services);
      }
    } catch (error) {
      services.log.error({ err: error }, 'rotation could not be carried on');
    } finally {
      running = false;
    }
  }, ADVANCE_EVERY_MS);
  timer.unref();
  return () => clearInterval(timer);
}
