import { personRoute } from '@/lib/http/person';
import { pictureOf } from '@/lib/http/picture';

/** The peaks of a recording, in our own binary layout. */
export const GET = personRoute(
  'GET /api/recordings/[id]/peaks',
  {},
  ({ person, params, services, request }) =>
    pictureOf('peaks', { person, number: params.id ?? '', services, request }),
);
