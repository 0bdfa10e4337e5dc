import { personRoute } from '@/lib/http/person';
import { addWebhook, NewWebhook } from '@/lib/webhooks/addWebhook';

/** Tell another system what happens. The secret is in this answer and nowhere else. */
export const POST = personRoute(
  'POST /api/webhooks',
  { body: NewWebhook },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => addWebhook(services, person, body, remember))),
);
