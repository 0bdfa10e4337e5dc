import { and, asc, eq, gte, lt, sql } from 'drizzle-orm';
import { custodyEntry, custodyNode } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Services } from '@/lib/platform/services';
import type { Place } from '../pure/shape';
import { nodeHashNow } from './hashes';
import { placeKey, readNodes } from './nodes';

/** Nodes that one transaction makes: others write in between. */
const AT_ONCE = 4_000;
/** Rows of one INSERT. */
const ROWS = 1_000;

interface Node extends Place {
  hash: Uint8Array;
}

/**
 * Add the subtrees that these new leaves complete, in the transaction that appends them: one node an entry on average,
 * as many as the tree is high at worst, whatever its size.
 *
 * @param first sequence number of the first new entry; the entries themselves are already in the transaction
 */
export async function growTree(tx: Tx, first: number, leaves: readonly Uint8Array[]): Promise<void> {
  const size = first + leaves.length;
  // A leaf at an even place completes nothing.
  if (Math.floor(first / 2) === Math.floor(size / 2)) return;
  const known = await readNodes(tx, borderOf(first, size));
  if (known.size < borderOf(first, size).length) {
    // Entries of an older version stand there without their subtrees: make those first.
    while ((await fillSome(tx, AT_ONCE)) > 0);
    return;
  }
  leaves.forEach((hash, i) => {
    known.set(placeKey({ level: 0, position: first + i }), hash);
  });
  await insertNodes(tx, completedBetween(first, size, known));
}

/** Places before the new leaves that they complete subtrees with, and those that must stand before a new one. */
function borderOf(first: number, size: number): Place[] {
  const border = new Map<string, Place>();
  for (let level = 0, width = 1; width <= size; level++, width *= 2) {
    const have = Math.floor(first / width);
    const want = Math.floor(size / width);
    if (want === have) continue;
    // On each level that grows, the last one there: it is either a left sibling or shows that the level is whole.
    if (have > 0) border.set(placeKey({ level, position: have - 1 }), { level, position: have - 1 });
  }
  return [...border.values()];
}

function completedBetween(first: number, size: number, known: Map<string, Uint8Array>): Node[] {
  const made: Node[] = [];
  for (let level = 1, width = 2; width <= size; level++, width *= 2) {
    for (let position = Math.floor(first / width); position < Math.floor(size / width); position++) {
      const left = known.get(placeKey({ level: level - 1, position: position * 2 }));
      const right = known.get(placeKey({ level: level - 1, position: position * 2 + 1 }));
      if (!left || !right) throw new Error('a subtree is complete before its halves are');
      const hash = nodeHashNow(left, right);
      known.set(placeKey({ level, position }), hash);
      made.push({ level, position, hash });
    }
  }
  return made;
}

async function insertNodes(tx: Tx, nodes: readonly Node[]): Promise<void> {
  for (let at = 0; at < nodes.length; at += ROWS)
    await tx.insert(custodyNode).values(nodes.slice(at, at + ROWS).map((node) => ({ ...node })));
}

/**
 * Bring up the tree of a log whose entries were there before it. Idempotent: a process that dies in between, or another
 * that does the same, leaves whole levels behind, and the next call goes on from there.
 *
 * @returns how many subtrees were made
 */
export async function bringTreeUp(services: Pick<Services, 'write'>): Promise<number> {
  let made = 0;
  for (;;) {
    const some = await services.write((tx) => fillSome(tx, AT_ONCE));
    if (some === 0) return made;
    made += some;
  }
}

/** Make the lowest missing subtrees, at most `most` of them. @returns how many */
async function fillSome(tx: Tx, most: number): Promise<number> {
  const [log] = await tx
    .select({ size: sql<number>`coalesce(max(${custodyEntry.sequence}) + 1, 0)` })
    .from(custodyEntry);
  const size = log?.size ?? 0;
  let made = 0;
  for (let level = 1, width = 2; width <= size && made < most; level++, width *= 2) {
    const [row] = await tx
      .select({ have: sql<number>`coalesce(max(${custodyNode.position}) + 1, 0)` })
      .from(custodyNode)
      .where(eq(custodyNode.level, level));
    const have = row?.have ?? 0;
    const want = Math.min(Math.floor(size / width), have + most - made);
    if (want <= have) continue;
    const children = await hashesOf(tx, level - 1, have * 2, want * 2);
    const nodes: Node[] = [];
    for (let position = have; position < want; position++) {
      const left = children[(position - have) * 2];
      const right = children[(position - have) * 2 + 1];
      if (!left || !right) throw new Error(`the log has a gap below ${(position + 1) * width}`);
      nodes.push({ level, position, hash: nodeHashNow(left, right) });
    }
    await insertNodes(tx, nodes);
    made += nodes.length;
  }
  return made;
}

async function hashesOf(tx: Tx, level: number, from: number, to: number): Promise<Uint8Array[]> {
  const rows =
    level === 0
      ? await tx
          .select({ hash: custodyEntry.leafHash })
          .from(custodyEntry)
          .where(and(gte(custodyEntry.sequence, from), lt(custodyEntry.sequence, to)))
          .orderBy(asc(custodyEntry.sequence))
      : await tx
          .select({ hash: custodyNode.hash })
          .from(custodyNode)
          .where(
            and(eq(custodyNode.level, level), gte(custodyNode.position, from), lt(custodyNode.position, to)),
          )
          .orderBy(asc(custodyNode.position));
  return rows.map(({ hash }) => hash);
}
