import { and, asc, eq, gt, inArray, isNull, sql } from 'drizzle-orm';
import { custodyEntry, device, outbox, webhook, webhookCursor, webhookDelivery } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Entry } from '@/lib/custody/entry';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { eventsOf } from './eventsOf';

/** Kind of the outbox's work. */
export const DELIVERY = 'webhook';
const AT_ONCE = 200;

/**
 * Turn what the log has new into deliveries. The cursor moves in the same transaction that writes them: each entry is
 * told once to each address, however many processes look and wherever one dies.
 *
 * @returns how many entries were looked at
 */
export async function fanOut(services: Pick<Services, 'read' | 'write' | 'clock'>): Promise<number> {
  const [[cursor], [end]] = await Promise.all([
    services.read.select().from(webhookCursor).limit(1),
    services.read
      .select({ last: sql<number>`coalesce(max(${custodyEntry.sequence}), -1)` })
      .from(custodyEntry),
  ]);
  // Nothing new costs one reading and no write.
  if (cursor && cursor.sequence >= (end?.last ?? -1)) return 0;
  return await services.write((tx) => fanOutIn(tx, services.clock.now()));
}

async function fanOutIn(tx: Tx, now: number): Promise<number> {
  const [cursor] = await tx.select().from(webhookCursor).limit(1);
  const [end] = await tx
    .select({ last: sql<number>`coalesce(max(${custodyEntry.sequence}), -1)` })
    .from(custodyEntry);
  const last = end?.last ?? -1;
  // A house that never told anybody does not begin with its history.
  if (!cursor) {
    await tx.insert(webhookCursor).values({ id: 'log', sequence: last });
    return 0;
  }
  const hooks = await tx.select().from(webhook).where(isNull(webhook.removedAt));
  if (hooks.length === 0) {
    await tx.update(webhookCursor).set({ sequence: last });
    return 0;
  }
  const rows = await tx
    .select({ sequence: custodyEntry.sequence, at: custodyEntry.at, canonical: custodyEntry.canonical })
    .from(custodyEntry)
    .where(gt(custodyEntry.sequence, cursor.sequence))
    .orderBy(asc(custodyEntry.sequence))
    .limit(AT_ONCE);
  const entries = rows.map((row) => ({ at: row.at, entry: JSON.parse(row.canonical) as Entry }));
  const tags = await assetTags(
    tx,
    entries.map(({ entry }) => entry),
  );
  for (const { at, entry } of entries) {
    for (const event of eventsOf(entry, (id) => tags.get(id) ?? null)) {
      const body = JSON.stringify(event);
      for (const hook of hooks) {
        // What happened before an address was given is none of its business.
        if (!hook.events.includes(event.type) || at < hook.createdAt) continue;
        await insertDelivery(tx, { webhookId: hook.id, eventId: event.id, type: event.type, body, now });
      }
    }
  }
  const reached = rows.at(-1)?.sequence;
  if (reached !== undefined) await tx.update(webhookCursor).set({ sequence: reached });
  return rows.length;
}

async function assetTags(tx: Tx, entries: Entry[]): Promise<Map<string, string>> {
  const ids = [
    ...new Set(
      entries.flatMap(({ subjects }) => subjects.filter(({ kind }) => kind === 'device').map(({ id }) => id)),
    ),
  ];
  if (ids.length === 0) return new Map();
  const rows = await tx
    .select({ id: device.id, tag: device.assetTag })
    .from(device)
    .where(inArray(device.id, ids));
  return new Map(rows.map((row) => [row.id, row.tag]));
}

interface NewDelivery {
  webhookId: string;
  eventId: string;
  type: string;
  body: string;
  now: number;
}

async function insertDelivery(tx: Tx, { now, ...row }: NewDelivery): Promise<void> {
  const id = newId();
  await tx.insert(webhookDelivery).values({ id, ...row, createdAt: now });
  await enqueueDelivery(tx, id, now);
}

/** Put a delivery in the outbox, or put it there again from the beginning. */
export async function enqueueDelivery(tx: Tx, id: string, now: number): Promise<void> {
  const fresh = {
    payload: { deliveryId: id },
    dueAt: now,
    leasedUntil: null,
    tries: 0,
    lastError: null,
    doneAt: null,
    deadAt: null,
  };
  await tx
    .insert(outbox)
    .values({ id, kind: DELIVERY, createdAt: now, ...fresh })
    .onConflictDoUpdate({ target: outbox.id, set: fresh });
}

/** Everything of an address that was held back while it was paused goes on its way. */
export async function releaseHeld(tx: Tx, webhookId: string, now: number): Promise<void> {
  const held = await tx
    .update(webhookDelivery)
    .set({ failure: null })
    .where(and(eq(webhookDelivery.webhookId, webhookId), eq(webhookDelivery.failure, HELD)))
    .returning({ id: webhookDelivery.id });
  for (const { id } of held) await enqueueDelivery(tx, id, now);
}

/** `failure` of a delivery that was held back because its address is paused. */
export const HELD = 'paused';
