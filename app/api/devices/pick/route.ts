import { z } from 'zod';
import { pickDevices } from '@/lib/fleet/pickDevices';
import { personRoute } from '@/lib/http/person';

const Query = z.strictObject({ q: z.string().trim().max(100).default('') });

/** Stethoscopes to choose from at the bedside. */
export const GET = personRoute(
  'GET /api/devices/pick',
  { query: Query },
  async ({ person, query, services }) =>
    Response.json({ results: await pickDevices(services, person, query.q) }),
);
