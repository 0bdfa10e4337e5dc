import { countBedside, EncounterFilter, listEncounters } from '@/lib/filing/readEncounters';
import { personRoute } from '@/lib/http/person';
import { asksReasonFor, reasonRequired } from '@/lib/http/reach';

/** Encounters that the person sees, with the counts that the page speaks of. */
export const GET = personRoute(
  'GET /api/encounters',
  { query: EncounterFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      listEncounters(services, person, query),
      countBedside(services, person),
    ]);
    const reason = page.rows.length === 0 ? await asksReasonFor(services, person, query.q) : null;
    if (reason) throw reasonRequired(reason);
    return Response.json({ ...page, counts });
  },
);
