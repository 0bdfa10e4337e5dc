import { personRoute } from '@/lib/http/person';
import { openRecording, reachRecording } from '@/lib/http/reach';
import { Refusal } from '@/lib/platform/errors';

const EXTENSIONS: Record<string, string> = {
  'audio/wav': 'wav',
  'audio/wave': 'wav',
  'audio/x-wav': 'wav',
  'audio/vnd.wave': 'wav',
  'audio/flac': 'flac',
  'audio/x-flac': 'flac',
  'audio/ogg': 'ogg',
  'audio/mpeg': 'mp3',
};

/** Take the original away: an entry, then a signed address of the store that serves it as an attachment for a minute. */
export const GET = personRoute(
  'GET /api/recordings/[id]/original',
  {},
  async ({ person, params, services }) => {
    const { recording } = await reachRecording(services, person, params.id ?? '');
    if (recording.originalKey === null) throw new Refusal('not-found');
    await openRecording(services, person, recording.number, 'downloaded', {
      detail: { sha256: recording.declaredSha256 },
    });
    const { url } = await services.storage.presignGet({
      key: recording.originalKey,
      expiresSeconds: 60,
      contentType: recording.mediaType,
      filename: `${recording.number}.${EXTENSIONS[recording.mediaType] ?? 'bin'}`,
    });
    return new Response(null, { status: 303, headers: { location: url, 'referrer-policy': 'no-referrer' } });
  },
);
