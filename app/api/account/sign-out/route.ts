import { withCookies } from '@/lib/http/cookies';
import { personRoute } from '@/lib/http/person';
import { signOut } from '@/lib/identity/signOut';

/** End this session. Takes a plain form's POST, so that it works without scripts. */
export const POST = personRoute('POST /api/account/sign-out', {}, async ({ person, peer, services }) => {
  const { cookies } = await signOut(services, person, peer);
  return withCookies(new Response(null, { status: 303, headers: { location: '/sign-in' } }), cookies);
});
