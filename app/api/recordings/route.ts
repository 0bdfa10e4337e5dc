import { ClipFilter, listClips } from '@/lib/filing/readRecordings';
import { personRoute } from '@/lib/http/person';

/** Clips filed on the person's wards. */
export const GET = personRoute(
  'GET /api/recordings',
  { query: ClipFilter },
  async ({ person, query, services }) => Response.json(await listClips(services, person, query)),
);
