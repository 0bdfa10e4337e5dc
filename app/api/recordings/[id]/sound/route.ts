import { personRoute } from '@/lib/http/person';
import { openRecording, reachRecording } from '@/lib/http/reach';
import { streamObject } from '@/lib/http/stream';
import { Refusal } from '@/lib/platform/errors';

/** The original's bytes for the player. Handing them out is hearing: the entry is written first. */
export const GET = personRoute('GET /api/recordings/[id]/sound', {}, async ({ person, params, services }) => {
  const { recording } = await reachRecording(services, person, params.id ?? '');
  if (recording.originalKey === null) throw new Refusal('not-found');
  await openRecording(services, person, recording.number, 'heard');
  return await streamObject(services.storage, recording.originalKey, {
    'content-type': recording.mediaType,
    'content-disposition': 'attachment',
  });
});
