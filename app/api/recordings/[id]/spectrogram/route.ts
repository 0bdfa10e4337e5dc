import { personRoute } from '@/lib/http/person';
import { pictureOf } from '@/lib/http/picture';

/** The spectrogram of a recording, in our own binary layout. */
export const GET = personRoute(
  'GET /api/recordings/[id]/spectrogram',
  {},
  ({ person, params, services, request }) =>
    pictureOf('spectrogram', { person, number: params.id ?? '', services, request }),
);
