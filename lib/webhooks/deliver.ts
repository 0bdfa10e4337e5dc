import { eq } from 'drizzle-orm';
import { z } from 'zod';
import { webhook, webhookDelivery } from '@/db/schema';
import { callOutside, OutsideError, type Resolve } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';
import { HELD } from './fanOut';
import { signatureFields } from './sign';

type Needs = Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'secrets'>;
type WebhookRow = typeof webhook.$inferSelect;
type DeliveryRow = typeof webhookDelivery.$inferSelect;

const Payload = z.object({ deliveryId: z.string() });
const TIMEOUT_MS = 10_000;
const LARGEST_ANSWER_BYTES = 64 * 1024;

export const secretBox = (webhookId: string) => `webhook ${webhookId}`;

class NotDelivered extends Error {
  override readonly name = 'NotDelivered';
}

/**
 * Deliver one event: the outbox's work. A receiver may get it twice, when we die after it answered; its id is the same.
 *
 * @throws NotDelivered so that the outbox tries again later, and sets it aside after twelve tries
 */
export async function deliverWebhook(
  services: Needs,
  payload: Record<string, unknown>,
  resolve?: Resolve,
): Promise<void> {
  const { deliveryId } = Payload.parse(payload);
  const [found] = await services.read
    .select({ delivery: webhookDelivery, hook: webhook })
    .from(webhookDelivery)
    .innerJoin(webhook, eq(webhook.id, webhookDelivery.webhookId))
    .where(eq(webhookDelivery.id, deliveryId))
    .limit(1);
  if (!found) return;
  const { delivery, hook } = found;
  if (hook.removedAt !== null) return await note(services, delivery.id, { failure: 'removed' });
  if (hook.pausedAt !== null) return await note(services, delivery.id, { failure: HELD });
  const outcome = await attempt(services, hook, delivery, resolve);
  await note(services, delivery.id, { ...outcome, triedAt: services.clock.now() });
  if (outcome.failure !== null) throw new NotDelivered(outcome.failure);
}

const note = async (services: Needs, id: string, set: Partial<DeliveryRow>): Promise<void> => {
  await services.write(async (tx) => {
    await tx.update(webhookDelivery).set(set).where(eq(webhookDelivery.id, id));
  });
};

/** The secrets that sign now: the one before too, while it is being replaced. */
function secretsOf(services: Needs, hook: WebhookRow): string[] {
  const open = (sealed: string) => services.secrets.open(sealed, secretBox(hook.id));
  const replacing =
    hook.sealedPreviousSecret !== null && (hook.previousEndsAt ?? 0) > services.clock.now()
      ? [open(hook.sealedPreviousSecret)]
      : [];
  return [open(hook.sealedSecret), ...replacing];
}

/** One try. What the receiver says is read to be thrown away: it is shown nowhere. */
export async function attempt(
  services: Needs,
  hook: WebhookRow,
  delivery: Pick<DeliveryRow, 'eventId' | 'body'>,
  resolve?: Resolve,
): Promise<{ status: number | null; failure: string | null }> {
  const signed = signatureFields(secretsOf(services, hook), {
    id: delivery.eventId,
    body: delivery.body,
    nowMs: services.clock.now(),
  });
  try {
    const { status } = await callOutside(services.env, hook.url, {
      method: 'POST',
      headers: { 'content-type': 'application/json', 'user-agent': 'Bellkeep', ...signed },
      body: delivery.body,
      timeoutMs: TIMEOUT_MS,
      largestBytes: LARGEST_ANSWER_BYTES,
      ...(resolve ? { resolve } : {}),
    });
    if (status >= 200 && status < 300) return { status, failure: null };
    const redirect = status >= 300 && status < 400;
    return { status, failure: redirect ? 'it redirects, which is not followed' : `it answers ${status}` };
  } catch (error) {
    if (error instanceof OutsideError) return { status: null, failure: error.message };
    throw error;
  }
}
