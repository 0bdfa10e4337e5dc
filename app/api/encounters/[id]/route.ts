import { readEncounterContents } from '@/lib/filing/readOneEncounter';
import { personRoute } from '@/lib/http/person';
import { reachEncounter } from '@/lib/http/reach';

/** One encounter, by its id or number, with its clips and listening sessions. */
export const GET = personRoute('GET /api/encounters/[id]', {}, async ({ person, params, services }) => {
  const encounter = await reachEncounter(services, person, params.id ?? '');
  return Response.json({ ...encounter, ...(await readEncounterContents(services, encounter)) });
});
