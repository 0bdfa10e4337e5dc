import { personRoute } from '@/lib/http/person';
import { PasskeyPlanRequest } from '@/lib/identity/passkeys/addPasskey';
import { removePasskey } from '@/lib/identity/passkeys/removePasskey';

/** Take one of one's own passkeys away. */
export const POST = personRoute(
  'POST /api/account/passkeys/[id]/remove',
  { body: PasskeyPlanRequest },
  async ({ person, body, params, services }) =>
    Response.json(await removePasskey(services, person, params.id ?? '', body.password)),
);
