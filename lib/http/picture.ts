import type { Authorized } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { openRecording } from './reach';
import { streamObject } from './stream';

/**
 * A derived picture. Its hash is its tag. Asked for under its hash (`?v=`) it never changes and is kept, by this browser
 * and for this session's cookie alone; without, the browser asks each time whether it still is the one.
 */
export async function pictureOf(
  kind: 'peaks' | 'spectrogram',
  {
    person,
    number,
    services,
    request,
  }: { person: Authorized<'recording.read'>; number: string; services: Services; request: Request },
): Promise<Response> {
  const clip = await openRecording(services, person, number, 'looked-at');
  const picture = clip.derived.find((derived) => derived.kind === kind);
  if (!picture) throw new Refusal('not-found');
  const named = new URL(request.url).searchParams.get('v') === picture.sha256;
  const headers = {
    etag: `"${picture.sha256}"`,
    'cache-control': named ? 'private, max-age=31536000, immutable' : 'private, no-cache',
    vary: 'cookie',
  };
  if (request.headers.get('if-none-match') === headers.etag)
    return new Response(null, { status: 304, headers });
  return await streamObject(services.storage, picture.key, {
    'content-type': 'application/octet-stream',
    ...headers,
  });
}
