import { fleetCsv } from '@/lib/fleet/csv';
import { FleetFilter, readFleet } from '@/lib/fleet/readFleet';
import { personRoute } from '@/lib/http/person';

/** The filtered fleet as CSV: whole, not a page. */
export const GET = personRoute(
  'GET /api/devices/csv',
  { query: FleetFilter.omit({ after: true, limit: true }) },
  async ({ person, query, services }) => {
    const rows = [];
    let after: string | null = null;
    do {
      const page: Awaited<ReturnType<typeof readFleet>> = await readFleet(services, person, {
        ...query,
        limit: 1000,
        ...(after ? { after } : {}),
      });
      rows.push(...page.rows);
      after = page.next;
    } while (after);
    return new Response(fleetCsv(rows), {
      headers: {
        'content-type': 'text/csv; charset=utf-8',
        'content-disposition': 'attachment; filename="fleet.csv"',
        'x-content-type-options': 'nosniff',
      },
    });
  },
);
