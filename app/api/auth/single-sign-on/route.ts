import { z } from 'zod';
import { publicRoute } from '@/lib/http/person';
import { safeNext } from '@/lib/http/safeNext';
import { beginSignOn } from '@/lib/identity/signOn/beginSignOn';
import { OutsideError } from '@/lib/platform/outside';

const Query = z.strictObject({ next: z.string().max(2000).optional() });

/** To the hospital's provider. */
export const GET = publicRoute(
  'GET /api/auth/single-sign-on',
  { query: Query },
  async ({ query, services }) => {
    const origin = services.env.BELLKEEP_ORIGIN;
    try {
      const { address, cookie } = await beginSignOn(services, safeNext(query.next, origin));
      return new Response(null, { status: 302, headers: { location: address, 'set-cookie': cookie } });
    } catch (error) {
      if (!(error instanceof OutsideError)) throw error;
      services.log.warn({ err: error }, 'the provider of single sign-on could not be asked');
      return new Response(null, {
        status: 302,
        headers: { location: `${origin}/sign-in?sign-on=unreachable` },
      });
    }
  },
);
