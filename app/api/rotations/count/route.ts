import { personRoute } from '@/lib/http/person';
import { Selection } from '@/lib/rotation/selection';
import { countSelection } from '@/lib/rotation/startRun';

/** How many credentials a selection hits now. Nothing is written. */
export const POST = personRoute(
  'POST /api/rotations/count',
  { body: Selection },
  async ({ person, body, services }) => Response.json(await countSelection(services, person, body)),
);
