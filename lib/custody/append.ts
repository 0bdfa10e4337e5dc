import { sql } from 'drizzle-orm';
import { custodyEntry, custodySubject } from '@/db/schema';
import type { Tx } from '@/db/write';
import { canonicalEntry, type Entry, type NewEntry } from './entry';
import { growTree } from './tree/grow';
import { leafHashNow } from './tree/hashes';

/**
 * Append to the custody log in the caller's transaction: the entry, its place in the tree and the change it tells of
 * commit together or not at all. Sequence numbers are dense because the transaction is immediate and there is one writer at a time.
 *
 * @param nowMs UTC milliseconds; a clock set back is written as it is, the order is the log's
 * @returns the sequence number of the last entry appended
 */
export async function appendEntries(tx: Tx, nowMs: number, entries: NewEntry[]): Promise<number> {
  const [row] = await tx
    .select({ next: sql<number>`coalesce(max(${custodyEntry.sequence}) + 1, 0)` })
    .from(custodyEntry);
  const first = row?.next ?? 0;
  let sequence = first;
  const leaves: Uint8Array[] = [];
  const at = new Date(nowMs).toISOString();
  for (const fresh of entries) {
    const entry: Entry = { ...fresh, sequence, at };
    const canonical = canonicalEntry(entry);
    const leafHash = leafHashNow(canonical);
    leaves.push(leafHash);
    await tx.insert(custodyEntry).values({
      sequence,
      at: nowMs,
      kind: entry.kind,
      actorKind: entry.actor.kind,
      actorId: entry.actor.id,
      canonical,
      leafHash,
    });
    const seen = new Set<string>();
    const subjects = entry.subjects.filter(
      (s) => !seen.has(`${s.kind} ${s.id}`) && seen.add(`${s.kind} ${s.id}`),
    );
    if (subjects.length > 0) {
      await tx
        .insert(custodySubject)
        .values(subjects.map((s) => ({ subjectKind: s.kind, subjectId: s.id, sequence })));
    }
    sequence++;
  }
  await growTree(tx, first, leaves);
  return sequence - 1;
}
