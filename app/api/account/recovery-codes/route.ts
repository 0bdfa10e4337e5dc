import { personRoute } from '@/lib/http/person';
import { newRecoveryCodes, WithPassword } from '@/lib/identity/secondFactor';

/** Ten new recovery codes; those before stop working. */
export const POST = personRoute(
  'POST /api/account/recovery-codes',
  { body: WithPassword },
  async ({ person, body, peer, services }) =>
    Response.json(await newRecoveryCodes(services, person, peer, body.password)),
);
