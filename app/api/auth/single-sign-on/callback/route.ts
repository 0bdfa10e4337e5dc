import { z } from 'zod';
import { publicRoute } from '@/lib/http/person';
import { SIGN_ON_COOKIE, signOnCookie } from '@/lib/identity/signOn/beginSignOn';
import { finishSignOn } from '@/lib/identity/signOn/finishSignOn';
import { Refusal } from '@/lib/platform/errors';

const word = z.string().max(4000).optional();
/** A provider may send more than is asked for. */
const Query = z.object({ code: word, state: word, iss: word, error: word });

const cookieOf = (headers: Headers): string | null =>
  (headers.get('cookie') ?? '')
    .split(/;\s*/)
    .find((pair) => pair.startsWith(`${SIGN_ON_COOKIE}=`))
    ?.slice(SIGN_ON_COOKIE.length + 1) ?? null;

/** Back from the hospital's provider. A browser is led on whatever comes of it. */
export const GET = publicRoute(
  'GET /api/auth/single-sign-on/callback',
  { query: Query },
  async ({ query, request, peer, services }) => {
    const headers = new Headers({ 'set-cookie': signOnCookie(services, '', 0) });
    const to = (path: string) => {
      headers.set('location', services.env.BELLKEEP_ORIGIN + path);
      return new Response(null, { status: 302, headers });
    };
    try {
      const { code, state, iss } = query;
      const handle = cookieOf(request.headers);
      const step = await finishSignOn(services, peer, { handle, code, state, iss });
      for (const line of step.cookies) headers.append('set-cookie', line);
      if (step.next === 'in') return to(step.address);
      return to(`/sign-in?step=${step.next}&next=${encodeURIComponent(step.address)}`);
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      services.log.info({ err: error.cause, problem: error.code }, 'single sign-on refused');
      return to('/sign-in?sign-on=refused');
    }
  },
);
