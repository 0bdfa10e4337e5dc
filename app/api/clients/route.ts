import { createClient, NewClient } from '@/lib/clients/createClient';
import { ClientFilter, readClients } from '@/lib/clients/readClients';
import { personRoute } from '@/lib/http/person';

/** API clients, a page at a time. */
export const GET = personRoute(
  'GET /api/clients',
  { query: ClientFilter },
  async ({ person, query, services }) => Response.json(await readClients(services, person, query)),
);

/** Let another system read. Its secret is in this answer and nowhere else. */
export const POST = personRoute(
  'POST /api/clients',
  { body: NewClient },
  async ({ person, body, services, idempotency }) =>
    Response.json(await idempotency.once((remember) => createClient(services, person, body, remember))),
);
