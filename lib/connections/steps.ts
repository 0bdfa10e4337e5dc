import { OutsideError } from '@/lib/platform/outside';
import type { CheckStep } from '@/lib/storage/port';

/** A step that did not do what it should, in a sentence for the page. */
export class StepFailed extends Error {}

/** Steps of a test, one after the other: after one that fails the rest is not tried. */
export function createSteps() {
  const steps: CheckStep[] = [];
  return {
    steps,
    async step(name: string, work: () => Promise<string>): Promise<void> {
      if (steps.some(({ ok }) => !ok)) {
        steps.push({ name, ok: false, detail: 'not tried' });
        return;
      }
      try {
        steps.push({ name, ok: true, detail: await work() });
      } catch (error) {
        // Only our own sentences: what another system says may hold anything.
        const known = error instanceof StepFailed || error instanceof OutsideError;
        const code = (error as { code?: unknown }).code;
        const detail = known ? error.message : typeof code === 'string' ? `failed (${code})` : 'failed';
        steps.push({ name, ok: false, detail });
      }
    },
  };
}
