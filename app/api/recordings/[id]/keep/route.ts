import { Keep, keepAnyway } from '@/lib/filing/keepAnyway';
import { personRoute } from '@/lib/http/person';
import { reachRecording } from '@/lib/http/reach';

/** Keep a clip that should be recorded again, with a reason. */
export const POST = personRoute(
  'POST /api/recordings/[id]/keep',
  { body: Keep },
  async ({ person, body, params, services, idempotency }) => {
    const clip = await reachRecording(services, person, params.id ?? '');
    return Response.json(
      await idempotency.once((remember) =>
        keepAnyway(services, person, clip.recording.number, body.reason, remember),
      ),
    );
  },
);
