import { countBedside, EncounterFilter, listEncounters } from '@/lib/filing/readEncounters';
import { personRoute } from '@/lib/http/person';

/** Encounters on the person's wards, with the counts that the page speaks of. */
export const GET = personRoute(
  'GET /api/encounters',
  { query: EncounterFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      listEncounters(services, person, query),
      countBedside(services, person),
    ]);
    return Response.json({ ...page, counts });
  },
);
