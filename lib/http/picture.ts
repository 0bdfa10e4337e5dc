import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { reachRecording } from './reach';
import { streamObject } from './stream';

/** A derived picture. Its hash is its tag: a browser that has it is told so. */
export async function pictureOf(
  kind: 'peaks' | 'spectrogram',
  {
    person,
    number,
    services,
    request,
  }: { person: Authorized<'recording.read'>; number: string; services: Services; request: Request },
): Promise<Response> {
  const clip = await reachRecording(services, person, number);
  const picture = clip.derived.find((derived) => derived.kind === kind);
  if (!picture) throw new Refusal('not-found');
  const headers = { etag: `"${picture.sha256}"`, 'cache-control': 'private, no-cache' };
  if (request.headers.get('if-none-match') === headers.etag)
    return new Response(null, { status: 304, headers });
  return await streamObject(services.storage, picture.key, {
    'content-type': 'application/octet-stream',
    ...headers,
  });
}
