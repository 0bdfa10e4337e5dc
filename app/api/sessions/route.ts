import { type Opened, openSession, SessionToOpen } from '@/lib/filing/openSession';
import { personRoute } from '@/lib/http/person';
import { reachEncounter } from '@/lib/http/reach';

/** Open a listening session: this device is with this patient from now on. */
export const POST = personRoute(
  'POST /api/sessions',
  { body: SessionToOpen },
  async ({ person, body, services, idempotency }) => {
    const { id } = await reachEncounter(services, person, body.encounterId);
    const opened = await idempotency.once<Opened>((remember) =>
      openSession(services, person, { ...body, encounterId: id }, remember),
    );
    return Response.json(opened, { status: opened.wasOpen ? 200 : 201 });
  },
);
