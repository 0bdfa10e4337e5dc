import { and, desc, lt } from 'drizzle-orm';
import { custodyHead } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { hex } from '../pure/hash';

/** A head as pages and routes show it. */
export interface HeadLine {
  size: number;
  /** Hex. */
  root: string;
  note: string;
  /** UTC milliseconds, by the clock of the service: a head itself holds no time. */
  madeAt: number;
}

/** Heads, of the largest tree first, a page at a time. @param options.before size of the last head of the page before */
export async function readHeads(
  services: Pick<Services, 'read'>,
  options: { before?: number | undefined; limit?: number | undefined } = {},
): Promise<{ rows: HeadLine[]; next: number | null }> {
  const limit = options.limit ?? 50;
  const rows = await services.read
    .select()
    .from(custodyHead)
    .where(and(options.before === undefined ? undefined : lt(custodyHead.size, options.before)))
    .orderBy(desc(custodyHead.size))
    .limit(limit + 1);
  return {
    rows: rows
      .slice(0, limit)
      .map(({ size, root, note, madeAt }) => ({ size, root: hex(root), note, madeAt })),
    next: rows.length > limit ? (rows[limit - 1]?.size ?? null) : null,
  };
}
