import { Filing, fileFromTray } from '@/lib/filing/fileFromTray';
import { personRoute } from '@/lib/http/person';
import { reachEncounter, reachRecording } from '@/lib/http/reach';

/** File a stray clip to an encounter, with two identifiers read. */
export const POST = personRoute(
  'POST /api/recordings/[id]/file',
  { body: Filing },
  async ({ person, body, params, services, idempotency }) => {
    const { recording } = await reachRecording(services, person, params.id ?? '');
    const { id } = await reachEncounter(services, person, body.encounterId);
    return Response.json(
      await idempotency.once((remember) =>
        fileFromTray(services, person, recording.number, { ...body, encounterId: id }, remember),
      ),
    );
  },
);
