import { personRoute } from '@/lib/http/person';
import { endOwnSessions, SessionsToEnd } from '@/lib/identity/sessions';

/** End one of one's own sessions, or all others. */
export const POST = personRoute(
  'POST /api/account/sessions/end',
  { body: SessionsToEnd },
  async ({ person, body, services }) => Response.json(await endOwnSessions(services, person, body)),
);
