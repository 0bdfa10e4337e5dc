import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { device, type SERVICE_STATES } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { endCredentials, endSessions } from './endOfService';

type State = (typeof SERVICE_STATES)[number];

export const StateChange = z.strictObject({
  to: z.enum(['in-service', 'quarantined', 'in-repair', 'retired']),
  reason: z.string().trim().min(5).max(500),
  version: z.number().int(),
});
export type StateChange = z.infer<typeof StateChange>;

/** Which service state may follow which. A device gets into service from "waiting" by enrolling, not by hand. */
const FOLLOWS: Record<State, readonly State[]> = {
  waiting: ['retired'],
  'in-service': ['quarantined', 'in-repair', 'retired'],
  quarantined: ['in-service', 'in-repair', 'retired'],
  'in-repair': ['in-service', 'quarantined', 'retired'],
  lost: ['quarantined', 'retired'],
  retired: [],
};

export const mayFollow = (from: State): readonly State[] => FOLLOWS[from];

const OUT_OF_SERVICE = { code: 'device-moved', words: 'device taken out of service' } as const;

interface Changed {
  assetTag: string;
  state: State;
  version: number;
}

/**
 * Take a device out of service, put it back, or retire it. Out of service its clips stay valid but are not taken,
 * and its listening session ends; retired, its credentials end too.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible`
 */
export async function changeState(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'fleet.write'>,
  deviceId: string,
  change: StateChange,
  remember?: (tx: Tx, answer: Changed) => Promise<void>,
): Promise<Changed> {
  const now = services.clock.now();
  const actor = personActor(by, 'fleet.write');
  return await services.write(async (tx) => {
    const [found] = await tx.select().from(device).where(eq(device.id, deviceId)).limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.version !== change.version)
      throw new Refusal(
        'stale',
        `${found.assetTag} was changed in the meantime: it is ${found.state.replace('-', ' ')} now.`,
        { version: found.version, state: found.state },
      );
    if (!FOLLOWS[found.state].includes(change.to)) {
      throw new Refusal(
        'not-possible',
        `${found.assetTag} is ${found.state.replace('-', ' ')}; from there it cannot go to ${change.to.replace('-', ' ')}.`,
      );
    }
    if (change.to === 'in-service' && found.keyThumbprint === null) {
      throw new Refusal(
        'not-possible',
        `${found.assetTag} never enrolled. Print an enrolment sheet; it comes into service by enrolling.`,
      );
    }
    const version = found.version + 1;
    await tx
      .update(device)
      .set({ state: change.to, stateReason: change.reason, version })
      .where(eq(device.id, deviceId));
    const entries: NewEntry[] = [
      {
        kind: 'device-state-changed',
        actor,
        subjects: [{ kind: 'device', id: deviceId }],
        detail: { reason: change.reason },
        before: { state: found.state },
        after: { state: change.to },
      },
    ];
    if (change.to !== 'in-service')
      entries.push(...(await endSessions(tx, deviceId, actor, now, OUT_OF_SERVICE)));
    if (change.to === 'retired')
      entries.push(...(await endCredentials(tx, deviceId, actor, now, 'device retired')));
    await appendEntries(tx, now, entries);
    const answer = { assetTag: found.assetTag, state: change.to, version };
    await remember?.(tx, answer);
    return answer;
  });
}
