import { sql } from 'drizzle-orm';
import { getServices } from '@/lib/http/services';

export const dynamic = 'force-dynamic';

/** Whether this process can do its work: for a proxy or a supervisor. It tells nothing else. */
export async function GET(): Promise<Response> {
  try {
    const services = await getServices();
    await services.read.run(sql`select 1`);
    return Response.json({ ok: true }, { headers: { 'cache-control': 'no-store' } });
  } catch {
    return Response.json({ ok: false }, { status: 503, headers: { 'cache-control': 'no-store' } });
  }
}
