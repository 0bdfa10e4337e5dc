import { forgottenSessions } from '@/db/queries/sessions';
import { appendEntries } from '@/lib/custody/append';
import { type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import type { Services } from '@/lib/platform/services';
import { endSession } from './closeSession';

/**
 * A session without a clip for this long is one that nobody ended. The stethoscope is long with somebody else, and its
 * next clip must not be filed to the patient before. Ours; a round at one bed takes minutes.
 */
export const QUIET_SESSION_MS = 2 * 3_600_000;

/**
 * End the sessions that were forgotten, and those whose encounter is over. Runs again and again; several processes may.
 *
 * @returns how many were ended
 */
export async function endForgottenSessions(
  services: Pick<Services, 'read' | 'write' | 'clock'>,
): Promise<number> {
  const now = services.clock.now();
  const quietSinceMs = now - QUIET_SESSION_MS;
  // Asked outside first: nobody waits for a transaction that has nothing to do.
  if ((await forgottenSessions(services.read, quietSinceMs)).length === 0) return 0;
  return await services.write(async (tx) => {
    const forgotten = await forgottenSessions(tx, quietSinceMs);
    const entries: NewEntry[] = [];
    for (const session of forgotten) {
      const words =
        session.encounterStatus === 'in-progress' ? 'no clip for two hours' : 'the encounter is over';
      entries.push(
        await endSession(tx, session, { actor: SERVICE_ACTOR, nowMs: now, why: 'timeout', words }),
      );
    }
    await appendEntries(tx, now, entries);
    return entries.length;
  });
}
