import { z } from 'zod';
import { closeSession } from '@/lib/filing/closeSession';
import { personRoute } from '@/lib/http/person';
import { reachSession } from '@/lib/http/reach';

/** End a listening session. */
export const POST = personRoute(
  'POST /api/sessions/[id]/close',
  { body: z.strictObject({}) },
  async ({ person, params, services, idempotency }) => {
    const { id } = await reachSession(services, person, params.id ?? '');
    return Response.json(await idempotency.once((remember) => closeSession(services, person, id, remember)));
  },
);
