import { personRoute } from '@/lib/http/person';
import { openRecording, reachRecording } from '@/lib/http/reach';
import { streamObject } from '@/lib/http/stream';
import { Refusal } from '@/lib/platform/errors';

/** The original's bytes, to be hashed in the reader's browser. Handing them out is an entry, written first. */
export const GET = personRoute(
  'GET /api/ledger/recordings/[number]/original',
  {},
  async ({ person, params, services }) => {
    const { recording } = await reachRecording(services, person, params.number ?? '');
    if (recording.originalKey === null) throw new Refusal('not-found');
    await openRecording(services, person, recording.number, 'downloaded', {
      detail: { why: 'verification', sha256: recording.declaredSha256 },
    });
    return await streamObject(services.storage, recording.originalKey, {
      'content-type': recording.mediaType,
      'content-disposition': 'attachment',
    });
  },
);
