import { z } from 'zod';
import { personRoute } from '@/lib/http/person';
import { repeatDelivery } from '@/lib/webhooks/changeWebhook';

/** Send a delivery again that was set aside. */
export const POST = personRoute(
  'POST /api/webhooks/deliveries/[id]/repeat',
  { body: z.strictObject({}) },
  async ({ person, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => repeatDelivery(services, person, params.id ?? '', remember)),
    ),
);
