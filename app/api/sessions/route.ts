import { openSession, SessionToOpen } from '@/lib/filing/openSession';
import { personRoute } from '@/lib/http/person';
import { reachEncounter } from '@/lib/http/reach';

/** Open a listening session: this device is with this patient from now on. */
export const POST = personRoute(
  'POST /api/sessions',
  { body: SessionToOpen },
  async ({ person, body, services, idempotency }) => {
    await reachEncounter(services, person, body.encounterId);
    return Response.json(
      await idempotency.once((remember) => openSession(services, person, body, remember)),
      { status: 201 },
    );
  },
);
