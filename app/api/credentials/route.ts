import { CredentialFilter, countCredentials, listCredentials } from '@/lib/credentials/readCredentials';
import { personRoute } from '@/lib/http/person';

/** Credentials by when they end, with how many stand in each view. */
export const GET = personRoute(
  'GET /api/credentials',
  { query: CredentialFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      listCredentials(services, person, query),
      countCredentials(services, person),
    ]);
    return Response.json({ ...page, counts });
  },
);
