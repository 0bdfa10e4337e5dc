import { personRoute } from '@/lib/http/person';
import { removeWebhook, WebhookRemoval } from '@/lib/webhooks/changeWebhook';

/** Tell this address no more. */
export const POST = personRoute(
  'POST /api/webhooks/[id]/remove',
  { body: WebhookRemoval },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => removeWebhook(services, person, params.id ?? '', body, remember)),
    ),
);
