import { personRoute } from '@/lib/http/person';
import { readSigningKeys } from '@/lib/keys/readSigningKeys';

/** The service's own keys and their lives. */
export const GET = personRoute('GET /api/signing-keys', {}, async ({ person, services }) =>
  Response.json({ rows: await readSigningKeys(services, person) }),
);
