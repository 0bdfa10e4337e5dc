import { noteAccess } from '@/lib/custody/noteAccess';
import { personRoute } from '@/lib/http/person';
import { reachRecording } from '@/lib/http/reach';
import { personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';

const EXTENSIONS: Record<string, string> = {
  'audio/wav': 'wav',
  'audio/wave': 'wav',
  'audio/x-wav': 'wav',
  'audio/flac': 'flac',
  'audio/ogg': 'ogg',
  'audio/mpeg': 'mp3',
};

/** Take the original away: an entry, then a signed address of the store that serves it as an attachment for a minute. */
export const GET = personRoute(
  'GET /api/recordings/[id]/original',
  {},
  async ({ person, params, services }) => {
    const { recording, patient } = await reachRecording(services, person, params.id ?? '');
    if (recording.originalKey === null) throw new Refusal('not-found');
    await noteAccess(services, 'downloaded', personActor(person, 'recording.read'), recording, {
      subjects: patient ? [{ kind: 'patient', id: patient.id }] : [],
      detail: { sha256: recording.declaredSha256 },
    });
    const { url } = await services.storage.presignGet({
      key: recording.originalKey,
      expiresSeconds: 60,
      contentType: recording.mediaType,
      filename: `${recording.number}.${EXTENSIONS[recording.mediaType] ?? 'bin'}`,
    });
    return new Response(null, { status: 303, headers: { location: url } });
  },
);
