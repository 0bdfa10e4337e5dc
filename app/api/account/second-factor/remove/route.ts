import { personRoute } from '@/lib/http/person';
import { removeOwnSecondFactor } from '@/lib/identity/removeSecondFactor';
import { WithPassword } from '@/lib/identity/secondFactor';

/** Take one's own second factor away, to set up another. */
export const POST = personRoute(
  'POST /api/account/second-factor/remove',
  { body: WithPassword },
  async ({ person, body, services }) => {
    await removeOwnSecondFactor(services, person, body.password);
    return Response.json({ on: false });
  },
);
