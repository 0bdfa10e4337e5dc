import { personRoute } from '@/lib/http/person';
import { describePerson } from '@/lib/identity/describePerson';
import { Refusal } from '@/lib/platform/errors';

/** One person with roles, wards and sessions. */
export const GET = personRoute('GET /api/people/[id]', {}, async ({ person, params, services }) => {
  const found = await describePerson(services, person, params.id ?? '');
  if (!found) throw new Refusal('not-found');
  return Response.json(found);
});
