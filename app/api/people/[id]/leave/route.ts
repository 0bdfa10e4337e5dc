import { personRoute } from '@/lib/http/person';
import { Leaving, personLeaves } from '@/lib/identity/personLeaves';

/** Somebody left. */
export const POST = personRoute(
  'POST /api/people/[id]/leave',
  { body: Leaving },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        personLeaves(services, person, params.id ?? '', body.reason, remember),
      ),
    ),
);
