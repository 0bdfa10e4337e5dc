import { withCookies } from '@/lib/http/cookies';
import { publicRoute } from '@/lib/http/person';
import { SignIn, signIn } from '@/lib/identity/signIn';

/** First step: e-mail and password. */
export const POST = publicRoute(
  'POST /api/auth/sign-in',
  { body: SignIn },
  async ({ body, peer, services }) => {
    const { next, cookies } = await signIn(services, peer, body);
    return withCookies(Response.json({ next }), cookies);
  },
);
