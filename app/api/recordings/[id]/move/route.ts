import { Move, moveFiling } from '@/lib/filing/moveFiling';
import { personRoute } from '@/lib/http/person';
import { reachEncounter, reachRecording } from '@/lib/http/reach';

/** Move a clip to another encounter, with a reason. */
export const POST = personRoute(
  'POST /api/recordings/[id]/move',
  { body: Move },
  async ({ person, body, params, services, idempotency }) => {
    const { recording } = await reachRecording(services, person, params.id ?? '');
    const { id } = await reachEncounter(services, person, body.encounterId);
    return Response.json(
      await idempotency.once((remember) =>
        moveFiling(services, person, recording.number, { ...body, encounterId: id }, remember),
      ),
    );
  },
);
