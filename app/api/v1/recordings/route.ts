import { RecordingsQuery, readRecordings } from '@/lib/clients/readForClient';
import { clientRoute } from '@/lib/http/client';

/** A page of recordings for another system. */
export const GET = clientRoute(
  'GET /api/v1/recordings',
  { query: RecordingsQuery },
  async ({ client, query, services }) => Response.json(await readRecordings(services, client, query)),
);
