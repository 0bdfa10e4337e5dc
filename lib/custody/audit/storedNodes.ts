import { and, asc, eq, gte } from 'drizzle-orm';
import { custodyNode } from '@/db/schema';
import type { Services } from '@/lib/platform/services';

const PAGE = 1_000;

interface Cursor {
  /** Position of the first hash in `page`. */
  rows: Map<number, Uint8Array>;
  from: number;
}

/** Stored subtrees, asked for in order on each level; a page of each level is held. */
export function storedNodes(services: Pick<Services, 'read'>) {
  const levels = new Map<number, Cursor>();
  return async (level: number, position: number): Promise<Uint8Array | null> => {
    let cursor = levels.get(level);
    if (!cursor || position >= cursor.from + PAGE || position < cursor.from) {
      const rows = await services.read
        .select({ position: custodyNode.position, hash: custodyNode.hash })
        .from(custodyNode)
        .where(and(eq(custodyNode.level, level), gte(custodyNode.position, position)))
        .orderBy(asc(custodyNode.position))
        .limit(PAGE);
      cursor = { from: position, rows: new Map(rows.map((row) => [row.position, row.hash])) };
      levels.set(level, cursor);
    }
    return cursor.rows.get(position) ?? null;
  };
}
