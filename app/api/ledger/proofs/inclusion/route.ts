import { z } from 'zod';
import { inclusionProofs } from '@/lib/custody/tree/prove';
import { personRoute } from '@/lib/http/person';

const MOST = 200;
const whole = z.coerce.number().int().min(0);

const Query = z.strictObject({
  /** One sequence number, or several with commas between them. */
  sequence: z
    .string()
    .regex(/^\d{1,15}(,\d{1,15})*$/, 'sequence numbers with commas between them')
    .transform((text) => text.split(',').map(Number))
    .refine((all) => all.length <= MOST, `at most ${MOST} at once`),
  size: whole,
});

/** Proofs that entries are in the tree of a size (RFC 9162, 2.1.3). They hold hashes only, no entry. */
export const GET = personRoute(
  'GET /api/ledger/proofs/inclusion',
  { query: Query },
  async ({ query, services }) =>
    Response.json({
      treeSize: query.size,
      proofs: await inclusionProofs(services.read, query.sequence, query.size),
    }),
);
