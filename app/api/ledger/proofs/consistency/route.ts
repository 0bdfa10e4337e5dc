import { z } from 'zod';
import { consistencyProof } from '@/lib/custody/tree/prove';
import { personRoute } from '@/lib/http/person';

const size = z.coerce.number().int().min(1);
const Query = z.strictObject({ from: size, to: size });

/** Proof that the tree of `to` entries holds the tree of the first `from`, unchanged (RFC 9162, 2.1.4). */
export const GET = personRoute(
  'GET /api/ledger/proofs/consistency',
  { query: Query },
  async ({ query, services }) => Response.json(await consistencyProof(services.read, query.from, query.to)),
);
