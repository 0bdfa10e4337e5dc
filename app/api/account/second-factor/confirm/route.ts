import { withCookies } from '@/lib/http/cookies';
import { personRoute } from '@/lib/http/person';
import { AuthenticatorCode } from '@/lib/identity/passSecondFactor';
import { confirmSecondFactor } from '@/lib/identity/secondFactor';

/** The first code: from here on the second factor is asked for. */
export const POST = personRoute(
  'POST /api/account/second-factor/confirm',
  { body: AuthenticatorCode },
  async ({ person, body, peer, services }) => {
    const { cookies } = await confirmSecondFactor(services, person, peer, body.code);
    return withCookies(Response.json({ on: true }), cookies);
  },
);
