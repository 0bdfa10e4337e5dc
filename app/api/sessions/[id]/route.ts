import { personRoute } from '@/lib/http/person';
import { reachSession } from '@/lib/http/reach';

/** A listening session with its clips. */
export const GET = personRoute('GET /api/sessions/[id]', {}, async ({ person, params, services }) =>
  Response.json(await reachSession(services, person, params.id ?? '')),
);
