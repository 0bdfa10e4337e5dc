import { personRoute } from '@/lib/http/person';
import { setWards, WardChange } from '@/lib/identity/setWards';

/** Say on which wards a person works. */
export const POST = personRoute(
  'POST /api/people/[id]/wards',
  { body: WardChange },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => setWards(services, person, params.id ?? '', body, remember)),
    ),
);
