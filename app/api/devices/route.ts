import { addDevice, NewDevice } from '@/lib/fleet/addDevice';
import { countFleet, FleetFilter, readFleet } from '@/lib/fleet/readFleet';
import { personRoute } from '@/lib/http/person';
import { personActor } from '@/lib/platform/authority';

/** The fleet, filtered and a page at a time, with the counts that its page speaks of. */
export const GET = personRoute(
  'GET /api/devices',
  { query: FleetFilter },
  async ({ person, query, services }) => {
    const [page, counts] = await Promise.all([
      readFleet(services, person, query),
      countFleet(services, person),
    ]);
    return Response.json({ ...page, counts });
  },
);

/** Put one device on the list. */
export const POST = personRoute(
  'POST /api/devices',
  { body: NewDevice },
  async ({ person, body, services }) =>
    Response.json(
      { id: await addDevice(services, personActor(person, 'fleet.write'), body) },
      { status: 201 },
    ),
);
