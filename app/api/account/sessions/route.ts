import { personRoute } from '@/lib/http/person';
import { sessionsOf } from '@/lib/identity/sessions';

/** One's own sessions. */
export const GET = personRoute('GET /api/account/sessions', {}, async ({ person, services }) =>
  Response.json({ sessions: await sessionsOf(services, person.id), current: person.sessionId }),
);
