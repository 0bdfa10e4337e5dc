import { personRoute } from '@/lib/http/person';
import { beginPasskey, PasskeyPlanRequest } from '@/lib/identity/passkeys/addPasskey';

/** Begin to add a passkey. */
export const POST = personRoute(
  'POST /api/account/passkeys/options',
  { body: PasskeyPlanRequest },
  async ({ person, body, services }) => Response.json(await beginPasskey(services, person, body.password)),
);
