import { personRoute } from '@/lib/http/person';
import { Removal, removeSecondFactor } from '@/lib/identity/removeSecondFactor';

/** Take away the second factor of somebody who lost it. */
export const POST = personRoute(
  'POST /api/people/[id]/remove-second-factor',
  { body: Removal },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        removeSecondFactor(services, person, params.id ?? '', body.reason, remember),
      ),
    ),
);
