import { z } from 'zod';
import { LostReport, reportLost, sentSince } from '@/lib/fleet/reportLost';
import { personRoute } from '@/lib/http/person';

/** What a device sent since a time. */
export const GET = personRoute(
  'GET /api/devices/[id]/lost',
  { query: z.strictObject({ since: z.coerce.number().int().positive() }) },
  async ({ person, query, params, services }) =>
    Response.json({ rows: await sentSince(services, person, params.id ?? '', query.since) }),
);

/** Report a device lost: everything of it that could be misused ends. */
export const POST = personRoute(
  'POST /api/devices/[id]/lost',
  { body: LostReport },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => reportLost(services, person, params.id ?? '', body, remember)),
    ),
);
