import { z } from 'zod';
import { readTray } from '@/lib/filing/readClips';
import { personRoute } from '@/lib/http/person';

const Query = z.strictObject({ before: z.coerce.number().int().optional() });

/** Clips that nothing ties to an encounter yet, with where each may belong and why. */
export const GET = personRoute('GET /api/tray', { query: Query }, async ({ person, query, services }) =>
  Response.json(await readTray(services, person, query.before)),
);
