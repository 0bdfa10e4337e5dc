import { personRoute } from '@/lib/http/person';
import { addPasskey, NewPasskey } from '@/lib/identity/passkeys/addPasskey';

/** Keep the passkey that the browser made. */
export const POST = personRoute(
  'POST /api/account/passkeys',
  { body: NewPasskey },
  async ({ person, body, services }) => Response.json(await addPasskey(services, person, body)),
);
