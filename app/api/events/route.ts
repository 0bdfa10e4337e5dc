import { eventStream } from '@/lib/http/liveEvents';
import { personRoute } from '@/lib/http/person';
import { Refusal } from '@/lib/platform/errors';

export const dynamic = 'force-dynamic';

/** What changes, as it changes (server-sent events). */
export const GET = personRoute('GET /api/events', {}, async ({ person, services, request }) => {
  const stream = await eventStream(services, person, request.signal);
  if (!stream)
    throw new Refusal(
      'too-many-requests',
      'Bellkeep is open in too many windows.',
      {},
      { headers: { 'retry-after': '30' } },
    );
  return stream;
});
