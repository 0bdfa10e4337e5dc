import { changeState, StateChange } from '@/lib/fleet/changeState';
import { personRoute } from '@/lib/http/person';

/** Take a device out of service, put it back, or retire it. */
export const POST = personRoute(
  'POST /api/devices/[id]/state',
  { body: StateChange },
  async ({ person, body, params, services, idempotency }) =>
    Response.json(
      await idempotency.once((remember) => changeState(services, person, params.id ?? '', body, remember)),
    ),
);
