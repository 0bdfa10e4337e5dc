import { personRoute } from '@/lib/http/person';
import { countPeople, listPeople, PeopleFilter } from '@/lib/identity/listPeople';

/** People a page at a time, with the counts that their page speaks of. */
export const GET = personRoute(
  'GET /api/people',
  { query: PeopleFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      listPeople(services, person, query),
      countPeople(services, person),
    ]);
    return Response.json({ ...page, counts });
  },
);
