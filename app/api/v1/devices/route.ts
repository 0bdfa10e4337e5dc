import { DevicesQuery, readDevices } from '@/lib/clients/readForClient';
import { clientRoute } from '@/lib/http/client';

/** A page of devices for another system. */
export const GET = clientRoute(
  'GET /api/v1/devices',
  { query: DevicesQuery },
  async ({ client, query, services }) => Response.json(await readDevices(services, client, query)),
);
