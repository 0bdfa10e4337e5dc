import { personRoute } from '@/lib/http/person';
import { reachRecording } from '@/lib/http/reach';
import { recordingView } from '@/lib/http/recordingView';

/** One recording as its page shows it. */
export const GET = personRoute('GET /api/recordings/[id]', {}, async ({ person, params, services }) =>
  Response.json(recordingView(await reachRecording(services, person, params.id ?? ''))),
);
