import { z } from 'zod';
import { askRenewal } from '@/lib/credentials/askRenewal';
import { personRoute } from '@/lib/http/person';

const Body = z.strictObject({ version: z.number().int() });

/** Rotate one credential: its device is told to renew, and the old one lives through an overlap. */
export const POST = personRoute(
  'POST /api/credentials/[id]/rotate',
  { body: Body },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        askRenewal(services, person, { id: params.id ?? '', version: body.version }, remember),
      ),
    ),
);
