import { and, desc, eq, isNull, lt, or, type SQL, sql } from 'drizzle-orm';
import { z } from 'zod';
import { outbox, user, webhook, webhookDelivery } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { HELD } from './fanOut';

export interface WebhookLine {
  id: string;
  name: string;
  url: string;
  events: string[];
  createdAt: number;
  createdBy: string;
  pausedAt: number | null;
  previousEndsAt: number | null;
  version: number;
  waiting: number;
  setAside: number;
  lastDeliveredAt: number | null;
}

type Reads = Pick<Services, 'read'>;
type By = Authorized<'connections.read'>;

const delivered = sql`(${webhookDelivery.status} between 200 and 299 and ${webhookDelivery.failure} is null)`;
const dead = sql`${outbox.deadAt} is not null`;
const held = eq(webhookDelivery.failure, HELD);
const onItsWay = sql`(${outbox.id} is not null and ${outbox.doneAt} is null and ${outbox.deadAt} is null)`;

async function linesOf(services: Reads, where: SQL | undefined): Promise<WebhookLine[]> {
  const rows = await services.read
    .select({
      id: webhook.id,
      name: webhook.name,
      url: webhook.url,
      events: webhook.events,
      createdAt: webhook.createdAt,
      createdBy: user.name,
      pausedAt: webhook.pausedAt,
      previousEndsAt: webhook.previousEndsAt,
      version: webhook.version,
      waiting: sql<number>`coalesce(sum(${onItsWay} or ${held}), 0)`,
      setAside: sql<number>`coalesce(sum(${dead}), 0)`,
      lastDeliveredAt: sql<number | null>`max(case when ${delivered} then ${webhookDelivery.triedAt} end)`,
    })
    .from(webhook)
    .innerJoin(user, eq(user.id, webhook.createdBy))
    .leftJoin(webhookDelivery, eq(webhookDelivery.webhookId, webhook.id))
    .leftJoin(outbox, eq(outbox.id, webhookDelivery.id))
    .where(and(isNull(webhook.removedAt), where))
    .groupBy(webhook.id)
    .orderBy(desc(webhook.createdAt), desc(webhook.id))
    .limit(200);
  return rows;
}

/** Addresses that are told what happens, the latest first. A house has few: they are read whole. */
export const readWebhooks = (services: Reads, _by: By): Promise<WebhookLine[]> =>
  linesOf(services, undefined);

/** One of them; null when there is none such. */
export async function readWebhook(services: Reads, _by: By, id: string): Promise<WebhookLine | null> {
  return (await linesOf(services, eq(webhook.id, id)))[0] ?? null;
}

export const DeliveryFilter = z.strictObject({
  view: z.enum(['all', 'waiting', 'set-aside', 'delivered']).default('all'),
  /** Keyset: `createdAt id` of the last row of the page before. */
  after: z
    .string()
    .regex(/^\d+ [\w-]+$/)
    .optional(),
});
export type DeliveryFilter = z.infer<typeof DeliveryFilter>;

export interface DeliveryLine {
  id: string;
  eventId: string;
  type: string;
  body: string;
  createdAt: number;
  triedAt: number | null;
  tries: number;
  status: number | null;
  failure: string | null;
  state: 'delivered' | 'waiting' | 'held' | 'set-aside' | 'failed';
  nextTryAt: number | null;
}

const DELIVERIES = 50;

/** Deliveries of one address, the latest first. */
export async function readDeliveries(
  services: Reads,
  _by: By,
  webhookId: string,
  filter: DeliveryFilter,
): Promise<{ rows: DeliveryLine[]; next: string | null }> {
  const [at, id] = filter.after?.split(' ') ?? [];
  const views: Record<DeliveryFilter['view'], SQL | undefined> = {
    all: undefined,
    waiting: or(onItsWay, held),
    'set-aside': dead,
    delivered,
  };
  const rows = await services.read
    .select({ delivery: webhookDelivery, work: outbox })
    .from(webhookDelivery)
    .leftJoin(outbox, eq(outbox.id, webhookDelivery.id))
    .where(
      and(
        eq(webhookDelivery.webhookId, webhookId),
        views[filter.view],
        at && id
          ? or(
              lt(webhookDelivery.createdAt, Number(at)),
              and(eq(webhookDelivery.createdAt, Number(at)), lt(webhookDelivery.id, id)),
            )
          : undefined,
      ),
    )
    .orderBy(desc(webhookDelivery.createdAt), desc(webhookDelivery.id))
    .limit(DELIVERIES + 1);
  const page = rows.slice(0, DELIVERIES);
  const last = page.at(-1)?.delivery;
  return {
    rows: page.map(({ delivery: { webhookId: _of, ...delivery }, work }) => {
      const state = stateOf(delivery, work);
      return {
        ...delivery,
        tries: work?.tries ?? 1,
        state,
        nextTryAt: state === 'waiting' ? (work?.dueAt ?? null) : null,
      };
    }),
    next: rows.length > DELIVERIES && last ? `${last.createdAt} ${last.id}` : null,
  };
}

function stateOf(
  delivery: Pick<typeof webhookDelivery.$inferSelect, 'status' | 'failure'>,
  work: typeof outbox.$inferSelect | null,
): DeliveryLine['state'] {
  if (delivery.failure === HELD) return 'held';
  if (work?.deadAt != null) return 'set-aside';
  if (work && work.doneAt === null) return 'waiting';
  return delivery.failure === null && delivery.status !== null ? 'delivered' : 'failed';
}
