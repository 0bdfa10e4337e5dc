import { personRoute } from '@/lib/http/person';
import { openRecording } from '@/lib/http/reach';
import { recordingView } from '@/lib/http/recordingView';

/** One recording as its page shows it. Reading it is looking at it. */
export const GET = personRoute('GET /api/recordings/[id]', {}, async ({ person, params, services }) =>
  Response.json(recordingView(await openRecording(services, person, params.id ?? '', 'looked-at'))),
);
