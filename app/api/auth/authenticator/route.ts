import { withCookies } from '@/lib/http/cookies';
import { publicRoute } from '@/lib/http/person';
import { AuthenticatorCode, passSecondFactor } from '@/lib/identity/passSecondFactor';

/** Second step: a code of the authenticator. */
export const POST = publicRoute(
  'POST /api/auth/authenticator',
  { body: AuthenticatorCode },
  async ({ body, peer, services }) => {
    const { next, cookies } = await passSecondFactor(services, peer, 'authenticator', body.code);
    return withCookies(Response.json({ next }), cookies);
  },
);
