import { personRoute } from '@/lib/http/person';
import { rotateWebhook, WebhookRotation } from '@/lib/webhooks/changeWebhook';

/** A new secret. It is in this answer and nowhere else. */
export const POST = personRoute(
  'POST /api/webhooks/[id]/rotate',
  { body: WebhookRotation },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => rotateWebhook(services, person, params.id ?? '', body, remember)),
    ),
);
