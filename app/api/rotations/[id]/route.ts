import { personRoute } from '@/lib/http/person';
import { MemberFilter, readRun } from '@/lib/rotation/readRuns';

/** One run with its members, a page at a time. */
export const GET = personRoute(
  'GET /api/rotations/[id]',
  { query: MemberFilter },
  async ({ person, query, params, services }) =>
    Response.json(await readRun(services, person, params.id ?? '', query)),
);
