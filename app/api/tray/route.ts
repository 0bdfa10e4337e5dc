import { readTray, TrayFilter } from '@/lib/filing/readTray';
import { personRoute } from '@/lib/http/person';

/** Clips that nothing ties to an encounter yet, with where each may belong and why. */
export const GET = personRoute('GET /api/tray', { query: TrayFilter }, async ({ person, query, services }) =>
  Response.json(await readTray(services, person, query)),
);
