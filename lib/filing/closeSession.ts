import { eq } from 'drizzle-orm';
import { encounter, listeningSession } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Actor, NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';

export interface Closed {
  number: string;
  /** UTC milliseconds. */
  closedAt: number;
}

interface OpenSession {
  id: string;
  number: string;
  deviceId: string;
  encounterId: string;
  patientId: string;
}

/** End a session that is open, in the caller's transaction. @returns the entry that tells of it, to be appended there */
export async function endSession(
  tx: Tx,
  session: OpenSession,
  end: { actor: Actor; nowMs: number; why: 'ended' | 'device-moved' | 'timeout'; words: string },
): Promise<NewEntry> {
  await tx
    .update(listeningSession)
    .set({ closedAt: end.nowMs, closedBy: end.actor.id, closedWhy: end.why })
    .where(eq(listeningSession.id, session.id));
  return {
    kind: 'session-closed',
    actor: end.actor,
    subjects: [
      { kind: 'session', id: session.id },
      { kind: 'device', id: session.deviceId },
      { kind: 'encounter', id: session.encounterId },
      { kind: 'patient', id: session.patientId },
    ],
    detail: { number: session.number, why: end.words },
  };
}

/**
 * End a session. Ending one that has ended is no error: the answer says when. The caller has checked that the person
 * may see the patient.
 *
 * @throws Refusal `not-found`
 */
export async function closeSession(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'session.write'>,
  id: string,
  remember?: (tx: Tx, answer: Closed) => Promise<void>,
): Promise<Closed> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [row] = await tx
      .select({ session: listeningSession, patientId: encounter.patientId })
      .from(listeningSession)
      .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
      .where(eq(listeningSession.id, id))
      .limit(1);
    if (!row) throw new Refusal('not-found');
    const answer = { number: row.session.number, closedAt: row.session.closedAt ?? now };
    if (row.session.closedAt === null) {
      const end = {
        actor: personActor(by, 'session.write'),
        nowMs: now,
        why: 'ended',
        words: 'ended',
      } as const;
      await appendEntries(tx, now, [await endSession(tx, { ...row.session, patientId: row.patientId }, end)]);
    }
    await remember?.(tx, answer);
    return answer;
  });
}
