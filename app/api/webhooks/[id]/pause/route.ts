import { personRoute } from '@/lib/http/person';
import { Pause, pauseWebhook } from '@/lib/webhooks/changeWebhook';

/** Hold deliveries back, or let them go on. */
export const POST = personRoute(
  'POST /api/webhooks/[id]/pause',
  { body: Pause },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => pauseWebhook(services, person, params.id ?? '', body, remember)),
    ),
);
