import { sql } from 'drizzle-orm';
import { readHealth } from '@/lib/health/readHealth';
import { worstOf } from '@/lib/health/types';
import { analysisFigures } from '@/lib/http/passage';
import { getServices } from '@/lib/http/services';

export const dynamic = 'force-dynamic';

interface Told {
  ok: boolean;
  parts?: Record<string, string>;
}
const KEPT_MS = 5_000;
const shared = globalThis as { bellkeepDeepHealth?: { at: number; told: Promise<Told> } };

async function lookDeep(): Promise<Told> {
  const services = await getServices();
  const parts = await readHealth(services, analysisFigures());
  return {
    ok: worstOf(parts) !== 'alarm',
    parts: Object.fromEntries(parts.map(({ id, state }) => [id, state])),
  };
}

/** Anybody may ask, so however many do there is one look in five seconds. */
function deep(): Promise<Told> {
  const before = shared.bellkeepDeepHealth;
  if (before && Date.now() - before.at < KEPT_MS) return before.told;
  const told = lookDeep();
  shared.bellkeepDeepHealth = { at: Date.now(), told };
  return told;
}

async function shallow(): Promise<Told> {
  const services = await getServices();
  await services.read.run(sql`select 1`);
  return { ok: true };
}

/**
 * Whether this process can do its work: for a proxy or a supervisor. With `?deep` also how each part is, in one word;
 * it tells nothing else.
 */
export async function GET(request?: Request): Promise<Response> {
  const headers = { 'cache-control': 'no-store' };
  try {
    const wanted = request !== undefined && new URL(request.url).searchParams.has('deep');
    const told = await (wanted ? deep() : shallow());
    return Response.json(told, { status: told.ok ? 200 : 503, headers });
  } catch {
    return Response.json({ ok: false }, { status: 503, headers });
  }
}
