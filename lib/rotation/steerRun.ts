import { and, eq } from 'drizzle-orm';
import { z } from 'zod';
import { rotationRun } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

export const Steering = z.strictObject({
  to: z.enum(['pause', 'resume', 'cancel']),
  version: z.number().int(),
});
export type Steering = z.infer<typeof Steering>;

const ACTS = {
  pause: { from: ['running'], state: 'paused', kind: 'rotation-paused' },
  resume: { from: ['paused'], state: 'running', kind: 'rotation-resumed' },
  cancel: { from: ['running', 'paused'], state: 'cancelled', kind: 'rotation-cancelled' },
} as const;

interface Steered {
  id: string;
  state: string;
  version: number;
}

/**
 * Pause, resume or cancel a run. Devices that were told already renew all the same; a paused run tells no more, and its
 * deadline stands.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible`
 */
export async function steerRun(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'credential.write'>,
  id: string,
  { to, version }: Steering,
  remember?: (tx: Tx, answer: Steered) => Promise<void>,
): Promise<Steered> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [run] = await tx.select().from(rotationRun).where(eq(rotationRun.id, id)).limit(1);
    if (!run) throw new Refusal('not-found');
    const act = ACTS[to];
    if (run.version !== version)
      throw new Refusal('stale', `${run.label} was changed in the meantime. It is ${run.state} now.`, {
        version: run.version,
      });
    if (!(act.from as readonly string[]).includes(run.state))
      throw new Refusal('not-possible', `${run.label} is ${run.state}.`);
    const next = run.version + 1;
    await tx
      .update(rotationRun)
      .set({
        state: act.state,
        version: next,
        ...(to === 'resume' ? { nextWaveAt: now } : {}),
        ...(to === 'cancel' ? { endedAt: now } : {}),
      })
      .where(and(eq(rotationRun.id, id), eq(rotationRun.version, version)));
    await appendEntries(tx, now, [
      {
        kind: act.kind,
        actor: personActor(by, 'credential.write'),
        subjects: [{ kind: 'rotation', id }],
        detail: { label: run.label },
      },
    ]);
    const answer = { id, state: act.state, version: next };
    await remember?.(tx, answer);
    return answer;
  });
}
