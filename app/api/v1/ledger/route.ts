import { LedgerQuery, readLedger } from '@/lib/clients/readForClient';
import { clientRoute } from '@/lib/http/client';

/** A page of the custody log for another system. */
export const GET = clientRoute(
  'GET /api/v1/ledger',
  { query: LedgerQuery },
  async ({ client, query, services }) => Response.json(await readLedger(services, client, query)),
);
