import { z } from 'zod';
import { personRoute } from '@/lib/http/person';
import { testWebhook } from '@/lib/webhooks/changeWebhook';

/** Send a test event now. */
export const POST = personRoute(
  'POST /api/webhooks/[id]/test',
  { body: z.strictObject({}) },
  async ({ person, params, services }) => Response.json(await testWebhook(services, person, params.id ?? '')),
);
