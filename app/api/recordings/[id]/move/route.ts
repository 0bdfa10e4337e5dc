import { Move, moveFiling } from '@/lib/filing/fileRecording';
import { personRoute } from '@/lib/http/person';
import { reachEncounter, reachRecording } from '@/lib/http/reach';

/** Move a clip to another encounter, with a reason. */
export const POST = personRoute(
  'POST /api/recordings/[id]/move',
  { body: Move },
  async ({ person, body, params, services, idempotency }) => {
    const clip = await reachRecording(services, person, params.id ?? '');
    await reachEncounter(services, person, body.encounterId);
    return Response.json(
      await idempotency.once((remember) =>
        moveFiling(services, person, clip.recording.number, body, remember),
      ),
    );
  },
);
