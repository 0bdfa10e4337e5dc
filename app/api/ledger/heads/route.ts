import { z } from 'zod';
import { headKeys } from '@/lib/custody/heads/headKeys';
import { readHeads } from '@/lib/custody/heads/readHeads';
import { personRoute } from '@/lib/http/person';

const Query = z.strictObject({
  before: z.coerce.number().int().min(0).optional(),
  limit: z.coerce.number().int().min(1).max(200).optional(),
});

/** Signed tree heads, of the largest tree first, and the keys that sign them. */
export const GET = personRoute('GET /api/ledger/heads', { query: Query }, async ({ query, services }) => {
  const [page, keys] = await Promise.all([readHeads(services, query), headKeys(services)]);
  return Response.json({ origin: services.env.BELLKEEP_CUSTODY_ORIGIN, keys, ...page });
});
