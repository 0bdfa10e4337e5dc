import { ConnectionChange, saveConnection } from '@/lib/connections/saveConnection';
import { personRoute } from '@/lib/http/person';

/** Set how another system is reached. */
export const POST = personRoute(
  'POST /api/connections/[kind]',
  { body: ConnectionChange },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) =>
        saveConnection(services, person, params.kind ?? '', body, remember),
      ),
    ),
);
