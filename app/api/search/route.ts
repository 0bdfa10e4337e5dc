import { z } from 'zod';
import { findThings } from '@/lib/http/findThings';
import { personRoute } from '@/lib/http/person';

const Query = z.strictObject({ q: z.string().max(100).default('') });

/** The command box: devices, recordings and patients within one's reach. */
export const GET = personRoute('GET /api/search', { query: Query }, async ({ person, query, services }) =>
  Response.json({ results: await findThings(services, person, query.q) }),
);
