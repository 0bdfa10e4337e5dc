import { personRoute } from '@/lib/http/person';
import { RunFilter, readRuns } from '@/lib/rotation/readRuns';
import { NewRun, startRun } from '@/lib/rotation/startRun';

/** Rotation runs, a page at a time. */
export const GET = personRoute(
  'GET /api/rotations',
  { query: RunFilter },
  async ({ person, query, services }) => Response.json(await readRuns(services, person, query)),
);

/** Start a rotation run over a selection of credentials. */
export const POST = personRoute(
  'POST /api/rotations',
  { body: NewRun },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => startRun(services, person, body, remember))),
);
