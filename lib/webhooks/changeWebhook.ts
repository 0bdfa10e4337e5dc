import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { outbox, webhook, webhookDelivery } from '@/db/schema';
import type { Tx } from '@/db/write';
import { TEST_EVENT } from '@/lib/contract/events';
import { appendEntries } from '@/lib/custody/append';
import type { EntryKind } from '@/lib/custody/entry';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId, newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import type { AddedWebhook } from './addWebhook';
import { attempt, secretBox } from './deliver';
import { enqueueDelivery, releaseHeld } from './fanOut';

type By = Authorized<'connections.write'>;
type Remember<T> = (tx: Tx, answer: T) => Promise<void>;
type Needs = Pick<Services, 'write' | 'clock'>;

const SECRET_OVERLAP_MS = 24 * 3_600_000;

export const Pause = z.strictObject({ version: z.number().int(), paused: z.boolean() });
export const WebhookRotation = z.strictObject({ version: z.number().int(), atOnce: z.boolean() });
export const WebhookRemoval = z.strictObject({
  version: z.number().int(),
  reason: z.string().trim().min(5).max(500),
});

async function load(tx: Tx, id: string, version: number) {
  const [row] = await tx
    .select()
    .from(webhook)
    .where(and(eq(webhook.id, id), isNull(webhook.removedAt)))
    .limit(1);
  if (!row) throw new Refusal('not-found');
  if (row.version !== version)
    throw new Refusal('stale', `${row.name} was changed in the meantime.`, { version: row.version });
  return row;
}

const entryOf = (kind: EntryKind, by: By, id: string, detail: Record<string, unknown>) => ({
  kind,
  actor: personActor(by, 'connections.write'),
  subjects: [{ kind: 'webhook' as const, id }],
  detail,
});

/**
 * Hold deliveries back, or let them go on. Nothing is lost meanwhile: what happens is kept for it.
 *
 * @throws Refusal `not-found`, `stale`
 */
export async function pauseWebhook(
  services: Needs,
  by: By,
  id: string,
  wanted: z.infer<typeof Pause>,
  remember?: Remember<{ paused: boolean }>,
): Promise<{ paused: boolean }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const row = await load(tx, id, wanted.version);
    await tx
      .update(webhook)
      .set({ pausedAt: wanted.paused ? now : null, version: row.version + 1 })
      .where(eq(webhook.id, id));
    if (!wanted.paused) await releaseHeld(tx, id, now);
    await appendEntries(tx, now, [
      entryOf('webhook-changed', by, id, { name: row.name, change: wanted.paused ? 'paused' : 'resumed' }),
    ]);
    const answer = { paused: wanted.paused };
    await remember?.(tx, answer);
    return answer;
  });
}

/**
 * A new secret. Both sign for a day, unless the old one is known to somebody.
 *
 * @throws Refusal `not-found`, `stale`
 */
export async function rotateWebhook(
  services: Needs & Pick<Services, 'secrets'>,
  by: By,
  id: string,
  wanted: z.infer<typeof WebhookRotation>,
  remember?: Remember<AddedWebhook>,
): Promise<AddedWebhook> {
  const now = services.clock.now();
  const secret = newSecret();
  return await services.write(async (tx) => {
    const row = await load(tx, id, wanted.version);
    await tx
      .update(webhook)
      .set({
        sealedSecret: services.secrets.seal(secret, secretBox(id)),
        sealedPreviousSecret: wanted.atOnce ? null : row.sealedSecret,
        previousEndsAt: wanted.atOnce ? null : now + SECRET_OVERLAP_MS,
        version: row.version + 1,
      })
      .where(eq(webhook.id, id));
    await appendEntries(tx, now, [
      entryOf('webhook-changed', by, id, { name: row.name, change: 'secret rotated', atOnce: wanted.atOnce }),
    ]);
    await remember?.(tx, { id, secret: null });
    return { id, secret };
  });
}

/**
 * Tell this address no more. What was not delivered is not delivered.
 *
 * @throws Refusal `not-found`, `stale`
 */
export async function removeWebhook(
  services: Needs,
  by: By,
  id: string,
  wanted: z.infer<typeof WebhookRemoval>,
  remember?: Remember<{ removedAt: number }>,
): Promise<{ removedAt: number }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const row = await load(tx, id, wanted.version);
    await tx
      .update(webhook)
      .set({ removedAt: now, version: row.version + 1 })
      .where(eq(webhook.id, id));
    await appendEntries(tx, now, [
      entryOf('webhook-removed', by, id, { name: row.name, reason: wanted.reason }),
    ]);
    const answer = { removedAt: now };
    await remember?.(tx, answer);
    return answer;
  });
}

/**
 * Send a test event now and say what came of it. It is tried once.
 *
 * @throws Refusal `not-found`
 */
export async function testWebhook(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>,
  _by: By,
  id: string,
): Promise<{ ok: boolean; status: number | null; failure: string | null }> {
  const [hook] = await services.read
    .select()
    .from(webhook)
    .where(and(eq(webhook.id, id), isNull(webhook.removedAt)))
    .limit(1);
  if (!hook) throw new Refusal('not-found');
  const now = services.clock.now();
  const eventId = `t-${newId()}`;
  const body = JSON.stringify({ id: eventId, type: TEST_EVENT, at: new Date(now).toISOString(), data: {} });
  const outcome = await attempt(services, hook, { eventId, body });
  await services.write(async (tx) => {
    await tx.insert(webhookDelivery).values({
      id: newId(),
      webhookId: id,
      eventId,
      type: TEST_EVENT,
      body,
      createdAt: now,
      triedAt: services.clock.now(),
      ...outcome,
    });
  });
  return { ok: outcome.failure === null, ...outcome };
}

/**
 * Send a delivery again that was set aside after its last try.
 *
 * @throws Refusal `not-found`; `not-possible` for one that was delivered or is on its way
 */
export async function repeatDelivery(
  services: Needs,
  by: By,
  deliveryId: string,
  remember?: Remember<{ repeated: true }>,
): Promise<{ repeated: true }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const [found] = await tx
      .select({ delivery: webhookDelivery, deadAt: outbox.deadAt })
      .from(webhookDelivery)
      .innerJoin(webhook, and(eq(webhook.id, webhookDelivery.webhookId), isNull(webhook.removedAt)))
      .leftJoin(outbox, eq(outbox.id, webhookDelivery.id))
      .where(eq(webhookDelivery.id, deliveryId))
      .limit(1);
    if (!found) throw new Refusal('not-found');
    if (found.deadAt === null)
      throw new Refusal('not-possible', 'Only a delivery that was set aside is sent again.');
    await enqueueDelivery(tx, deliveryId, now);
    await appendEntries(tx, now, [
      entryOf('delivery-repeated', by, found.delivery.webhookId, {
        type: found.delivery.type,
        event: found.delivery.eventId,
      }),
    ]);
    const answer = { repeated: true as const };
    await remember?.(tx, answer);
    return answer;
  });
}
