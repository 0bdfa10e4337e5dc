import { type SQL, sql } from 'drizzle-orm';
import type { Reader } from '@/db/client';
import { custodyEntry, custodyNode } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Place } from '../pure/shape';

export const placeKey = ({ level, position }: Place): string => `${level} ${position}`;

interface Row {
  level: number;
  position: number;
  hash: ArrayBuffer | Uint8Array;
}

/**
 * Hashes of complete subtrees by their places, in one query of indexed reads; level 0 are the leaves. What is not
 * there is not in the answer.
 */
export async function readNodes(
  from: Reader | Tx,
  places: readonly Place[],
): Promise<Map<string, Uint8Array>> {
  const leaves = places.filter((place) => place.level === 0);
  const nodes = places.filter((place) => place.level > 0);
  const parts: SQL[] = [];
  if (leaves.length > 0)
    parts.push(
      sql`select 0 as level, ${custodyEntry.sequence} as position, ${custodyEntry.leafHash} as hash from ${custodyEntry} where ${custodyEntry.sequence} in (${sql.join(
        leaves.map(({ position }) => sql`${position}`),
        sql`, `,
      )})`,
    );
  if (nodes.length > 0)
    parts.push(
      sql`select ${custodyNode.level}, ${custodyNode.position}, ${custodyNode.hash} from ${custodyNode} where (${custodyNode.level}, ${custodyNode.position}) in (values ${sql.join(
        nodes.map(({ level, position }) => sql`(${level}, ${position})`),
        sql`, `,
      )})`,
    );
  if (parts.length === 0) return new Map();
  const rows = await from.all<Row>(sql.join(parts, sql` union all `));
  return new Map(rows.map((row) => [placeKey(row), new Uint8Array(row.hash)]));
}
