import { and, desc, eq, gte, isNull, sql } from 'drizzle-orm';
import { z } from 'zod';
import { device, outbox, recording, type SERVICE_STATES } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Actor, NewEntry } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { endCredentials, endSessions } from './endOfService';

export const LostReport = z.strictObject({
  /** When it was last surely in hand, UTC ms. */
  lastInHandAt: z.number().int().positive(),
  reason: z.string().trim().min(5, 'A reason of at least five letters is needed.').max(500),
  version: z.number().int(),
});
export type LostReport = z.infer<typeof LostReport>;

interface Reported {
  assetTag: string;
  state: (typeof SERVICE_STATES)[number];
  version: number;
  /** Recordings it sent since it was last surely in hand. */
  sentSince: number;
}

/**
 * A device is lost: in one act its credentials are revoked, its codes and slots are closed, its listening session ends,
 * and biomedical engineering is told by mail. What it sent since it was last surely in hand stays where it is and is
 * listed. Found again, it is quarantined and enrols anew.
 *
 * @throws Refusal `not-found`, `stale`, `not-possible` for one that is lost or retired already, or a time to come
 */
export async function reportLost(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'device.lost'>,
  deviceId: string,
  report: LostReport,
  remember?: (tx: Tx, answer: Reported) => Promise<void>,
): Promise<Reported> {
  const now = services.clock.now();
  const actor = personActor(by, 'device.lost');
  if (report.lastInHandAt > now)
    throw new Refusal('not-possible', 'It was last in hand in the past, not in a time to come.');
  return await services.write(async (tx) => {
    const [found] = await tx.select().from(device).where(eq(device.id, deviceId)).limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.version !== report.version)
      throw new Refusal('stale', `${found.assetTag} was changed in the meantime: it is ${found.state} now.`, {
        version: found.version,
        state: found.state,
      });
    if (found.state === 'lost' || found.state === 'retired')
      throw new Refusal('not-possible', `${found.assetTag} is ${found.state} already.`);
    const version = found.version + 1;
    await tx
      .update(device)
      .set({ state: 'lost', stateReason: report.reason, version })
      .where(eq(device.id, deviceId));
    const ended = await closeAll(tx, deviceId, actor, now);
    const [sent] = await tx
      .select({ count: sql<number>`count(*)` })
      .from(recording)
      .where(and(eq(recording.deviceId, deviceId), gte(recording.receivedAt, report.lastInHandAt)));
    await appendEntries(tx, now, [
      {
        kind: 'device-lost',
        actor,
        subjects: [{ kind: 'device', id: deviceId }],
        detail: {
          reason: report.reason,
          lastInHandAt: new Date(report.lastInHandAt).toISOString(),
          sentSince: sent?.count ?? 0,
        },
        before: { state: found.state },
        after: { state: 'lost' },
      },
      ...ended,
    ]);
    await tx.insert(outbox).values({
      id: newId(),
      kind: 'device-lost',
      payload: { noticeId: newId(), deviceId, assetTag: found.assetTag, sentSince: sent?.count ?? 0 },
      createdAt: now,
      dueAt: now,
    });
    const answer = { assetTag: found.assetTag, state: 'lost' as const, version, sentSince: sent?.count ?? 0 };
    await remember?.(tx, answer);
    return answer;
  });
}

/** Credentials, codes, slots and the listening session of a device end. */
async function closeAll(tx: Tx, deviceId: string, actor: Actor, now: number): Promise<NewEntry[]> {
  const revoked = await endCredentials(tx, deviceId, actor, now, 'device lost');
  // A presigned address may live a few minutes longer: what is put there is not taken up any more.
  await tx
    .update(recording)
    .set({ slotExpiresAt: now, stopped: 'slot-ended' })
    .where(and(eq(recording.deviceId, deviceId), eq(recording.stage, 'awaited'), isNull(recording.stopped)));
  return [
    ...revoked,
    ...(await endSessions(tx, deviceId, actor, now, { code: 'device-lost', words: 'device lost' })),
  ];
}

export interface SentClip {
  id: string;
  number: string;
  recordedAt: number;
  receivedAt: number | null;
  verdict: string | null;
  filed: boolean;
}

/** What a device sent since a time, youngest first, without a word of whose chest it was. @returns at most 500 */
export async function sentSince(
  services: Pick<Services, 'read'>,
  _by: Authorized<'device.lost'>,
  deviceId: string,
  sinceMs: number,
): Promise<SentClip[]> {
  const rows = await services.read
    .select({
      id: recording.id,
      number: recording.number,
      recordedAt: recording.recordedAt,
      receivedAt: recording.receivedAt,
      verdict: recording.verdict,
      filedAt: recording.filedAt,
    })
    .from(recording)
    .where(and(eq(recording.deviceId, deviceId), gte(recording.receivedAt, sinceMs)))
    .orderBy(desc(recording.receivedAt))
    .limit(500);
  return rows.map(({ filedAt, ...row }) => ({ ...row, filed: filedAt !== null }));
}
