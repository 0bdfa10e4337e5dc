import { noteAccess } from '@/lib/custody/noteAccess';
import { personRoute } from '@/lib/http/person';
import { reachRecording } from '@/lib/http/reach';
import { streamObject } from '@/lib/http/stream';
import { personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';

/** The original's bytes for the player. Handing them out is hearing: the entry is written first. */
export const GET = personRoute('GET /api/recordings/[id]/sound', {}, async ({ person, params, services }) => {
  const clip = await reachRecording(services, person, params.id ?? '');
  if (clip.recording.originalKey === null) throw new Refusal('not-found');
  await noteAccess(services, 'heard', personActor(person, 'recording.read'), clip.recording, {
    subjects: clip.patient ? [{ kind: 'patient', id: clip.patient.id }] : [],
  });
  return await streamObject(services.storage, clip.recording.originalKey, {
    'content-type': clip.recording.mediaType,
    'content-disposition': 'attachment',
  });
});
