import { personRoute } from '@/lib/http/person';
import { endSessions } from '@/lib/identity/endSessions';

/** End all sessions of a person. */
export const POST = personRoute(
  'POST /api/people/[id]/end-sessions',
  {},
  async ({ person, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => endSessions(services, person, params.id ?? '', remember)),
    ),
);
