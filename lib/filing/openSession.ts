import { and, eq, isNull, or, sql } from 'drizzle-orm';
import { z } from 'zod';
import { device, encounter, listeningSession, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

export const SessionToOpen = z.strictObject({
  encounterId: z.string().min(1).max(64),
  /** Asset tag, serial number or UDI as scanned or typed. */
  device: z.string().trim().min(1).max(200),
  /** The device is in another open session, and is here now. */
  takeOver: z.boolean().default(false),
});
export type SessionToOpen = z.infer<typeof SessionToOpen>;

interface Opened {
  id: string;
  number: string;
}

/**
 * "This device is with this patient from now on": clips in that window file themselves. The caller has checked that
 * the person may see the encounter's patient.
 *
 * @throws Refusal `not-found`; `not-possible` when the device is not in service, the encounter is over, or the device
 *   is in another session (then with `session` and `since`; taking over ends that one)
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
    const [place] = await tx.select().from(encounter).where(eq(encounter.id, wanted.encounterId)).limit(1);
    if (!place) throw new Refusal('not-found');
    if (place.status !== 'in-progress')
      throw new Refusal(
        'not-possible',
        `Encounter ${place.number} is ${place.status.replace('-', ' ')}. Choose one that is running.`,
      );
    const found = await findDevice(tx, wanted.device);
    const entries: NewEntry[] = [];
    const [open] = await tx
      .select({ session: listeningSession, opener: user.name })
      .from(listeningSession)
      .innerJoin(user, eq(user.id, listeningSession.openedBy))
      .where(and(eq(listeningSession.deviceId, found.id), isNull(listeningSession.closedAt)))
      .limit(1);
    if (open && open.session.encounterId === place.id)
      return { id: open.session.id, number: open.session.number };
    if (open && !wanted.takeOver) {
      throw new Refusal(
        'not-possible',
        `${found.assetTag} is in listening session ${open.session.number}, opened by ${open.opener}. Take it over if it is here now.`,
        {
          session: open.session.number,
          since: open.session.openedAt,
          takeOver: true,
        },
      );
    }
    if (open) {
      await tx
        .update(listeningSession)
        .set({ closedAt: now, closedBy: by.id, closedWhy: 'device-moved' })
        .where(eq(listeningSession.id, open.session.id));
      entries.push({
        kind: 'session-closed',
        actor,
        subjects: [
          { kind: 'session', id: open.session.id },
          { kind: 'device', id: found.id },
          { kind: 'encounter', id: open.session.encounterId },
        ],
        detail: { number: open.session.number, why: 'device moved' },
      });
    }
    const [count] = await tx.select({ n: sql<number>`count(*)` }).from(listeningSession);
    const answer: Opened = { id: newId(), number: `S-${2001 + (count?.n ?? 0)}` };
    await tx
      .insert(listeningSession)
      .values({ ...answer, deviceId: found.id, encounterId: place.id, openedBy: by.id, openedAt: now });
    entries.push({
      kind: 'session-opened',
      actor,
      subjects: [
        { kind: 'session', id: answer.id },
        { kind: 'device', id: found.id },
        { kind: 'encounter', id: place.id },
        { kind: 'patient', id: place.patientId },
      ],
      detail: { number: answer.number, assetTag: found.assetTag, encounter: place.number },
    });
    await appendEntries(tx, now, entries);
    await remember?.(tx, answer);
    return answer;
  });
}

async function findDevice(tx: Tx, word: string) {
  const rows = await tx
    .select()
    .from(device)
    .where(
      or(
        eq(device.assetTag, word.toUpperCase()),
        eq(device.assetTag, word),
        eq(device.serialNumber, word),
        eq(device.udi, word),
      ),
    )
    .limit(2);
  const found = rows[0];
  if (!found)
    throw new Refusal(
      'not-possible',
      `No device goes by “${word}”. Scan its label again, or type the asset tag.`,
    );
  if (rows.length > 1)
    throw new Refusal('not-possible', `More than one device goes by “${word}”. Type the asset tag.`);
  if (found.state !== 'in-service')
    throw new Refusal(
      'not-possible',
      `${found.assetTag} is ${found.state.replace('-', ' ')}. Take another stethoscope.`,
    );
  return found;
}

/**
 * End a session. Ending one that has ended is no error: the answer says when.
 *
 * @throws Refusal `not-found`
 */
export async function closeSession(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'session.write'>,
  id: string,
  remember?: (tx: Tx, answer: { number: string; closedAt: number }) => Promise<void>,
): Promise<{ number: string; closedAt: number }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [open] = await tx.select().from(listeningSession).where(eq(listeningSession.id, id)).limit(1);
    if (!open) throw new Refusal('not-found');
    const answer = { number: open.number, closedAt: open.closedAt ?? now };
    if (open.closedAt === null) {
      await tx
        .update(listeningSession)
        .set({ closedAt: now, closedBy: by.id, closedWhy: 'ended' })
        .where(eq(listeningSession.id, id));
      await appendEntries(tx, now, [
        {
          kind: 'session-closed',
          actor: personActor(by, 'session.write'),
          subjects: [
            { kind: 'session', id },
            { kind: 'device', id: open.deviceId },
            { kind: 'encounter', id: open.encounterId },
          ],
          detail: { number: open.number, why: 'ended' },
        },
      ]);
    }
    await remember?.(tx, answer);
    return answer;
  });
}
