import { withCookies } from '@/lib/http/cookies';
import { publicRoute } from '@/lib/http/person';
import { PasskeySignIn, signInByPasskey } from '@/lib/identity/passkeys/signInByPasskey';

/** Sign in with a passkey. */
export const POST = publicRoute(
  'POST /api/auth/passkey',
  { body: PasskeySignIn },
  async ({ body, peer, services }) => {
    const { next, cookies } = await signInByPasskey(services, peer, body);
    return withCookies(Response.json({ next }), cookies);
  },
);
