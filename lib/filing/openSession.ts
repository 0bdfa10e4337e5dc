import { and, eq, isNull, sql } from 'drizzle-orm';
import { z } from 'zod';
import { encounter, listeningSession, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Actor, NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { endSession } from './closeSession';
import { findDevice } from './findDevice';

export const SessionToOpen = z.strictObject({
  encounterId: z.string().min(1).max(64),
  /** Asset tag, serial number or UDI as scanned or typed. */
  device: z.string().trim().min(1).max(200),
  /** The device is in another open session, and is here now. */
  takeOver: z.boolean().default(false),
});
export type SessionToOpen = z.infer<typeof SessionToOpen>;

export interface Opened {
  id: string;
  number: string;
  /** The device was with this patient already: its open session goes on. */
  wasOpen: boolean;
}

/**
 * "This device is with this patient from now on": clips in that window file themselves. The caller has checked that
 * the person may see the encounter's patient.
 *
 * @throws Refusal `not-found`; `not-possible` when the device is not in service, the encounter is not running, or the
 *   device is in another session (then with `session`, `since` and `takeOver`; taking over ends that one)
 */
export async function openSession(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'session.write'>,
  wanted: SessionToOpen,
  remember?: (tx: Tx, answer: Opened) => Promise<void>,
): Promise<Opened> {
  const now = services.clock.now();
  const actor = personActor(by, 'session.write');
  return await services.write(async (tx) => {
    const place = await runningEncounter(tx, wanted.encounterId);
    const found = await findDevice(tx, wanted.device);
    const open = await openSessionOf(tx, found.id);
    let answer: Opened;
    if (open?.session.encounterId === place.id) {
      answer = { id: open.session.id, number: open.session.number, wasOpen: true };
    } else {
      if (open && !wanted.takeOver) throw inUse(found.assetTag, open);
      const entries = open ? [await moveDevice(tx, open, actor, now)] : [];
      const number = await nextNumber(tx);
      answer = { id: newId(), number, wasOpen: false };
      await tx.insert(listeningSession).values({
        id: answer.id,
        number,
        deviceId: found.id,
        encounterId: place.id,
        openedBy: by.id,
        openedAt: now,
      });
      entries.push({
        kind: 'session-opened',
        actor,
        subjects: [
          { kind: 'session', id: answer.id },
          { kind: 'device', id: found.id },
          { kind: 'encounter', id: place.id },
          { kind: 'patient', id: place.patientId },
        ],
        detail: { number, assetTag: found.assetTag, encounter: place.number },
      });
      await appendEntries(tx, now, entries);
    }
    await remember?.(tx, answer);
    // Durable when this transaction commits. Died before: the session that was open before still is. Died after: asking
    // again answers with the session that is open now.
    return answer;
  });
}

async function runningEncounter(tx: Tx, id: string) {
  const [place] = await tx.select().from(encounter).where(eq(encounter.id, id)).limit(1);
  if (!place) throw new Refusal('not-found');
  if (place.status !== 'in-progress')
    throw new Refusal(
      'not-possible',
      `Encounter ${place.number} is ${place.status}. Choose one that is running.`,
    );
  return place;
}

async function openSessionOf(tx: Tx, deviceId: string) {
  const [open] = await tx
    .select({ session: listeningSession, opener: user.name, patientId: encounter.patientId })
    .from(listeningSession)
    .innerJoin(user, eq(user.id, listeningSession.openedBy))
    .innerJoin(encounter, eq(encounter.id, listeningSession.encounterId))
    .where(and(eq(listeningSession.deviceId, deviceId), isNull(listeningSession.closedAt)))
    .limit(1);
  return open ?? null;
}
type Open = NonNullable<Awaited<ReturnType<typeof openSessionOf>>>;

const inUse = (assetTag: string, { session, opener }: Open): Refusal =>
  new Refusal(
    'not-possible',
    `${assetTag} is in listening session ${session.number}, opened by ${opener}. Take it over if it is here now.`,
    { session: session.number, since: session.openedAt, openedBy: opener, takeOver: true },
  );

const moveDevice = (tx: Tx, { session, patientId }: Open, actor: Actor, now: number): Promise<NewEntry> =>
  endSession(
    tx,
    { ...session, patientId },
    { actor, nowMs: now, why: 'device-moved', words: 'device moved' },
  );

/** Sessions are never removed, and one transaction runs at a time: the count is the next number. */
async function nextNumber(tx: Tx): Promise<string> {
  const [row] = await tx.select({ n: sql<number>`count(*)` }).from(listeningSession);
  return `S-${2001 + (row?.n ?? 0)}`;
}
