import { and, desc, eq, inArray } from 'drizzle-orm';
import { custodyEntry, custodySubject } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import type { Entry, EntryKind, Subject } from './entry';

export interface HistoryLine {
  sequence: number;
  /** UTC milliseconds. */
  at: number;
  kind: string;
  entry: Entry;
}

/**
 * The latest entries of some kinds that speak of one subject, newest first. The caller has checked that the person may
 * see it; who looked at what is not history, and is asked for in the ledger.
 */
export async function readHistory(
  services: Pick<Services, 'read'>,
  subject: Subject,
  kinds: readonly EntryKind[],
  limit = 30,
): Promise<HistoryLine[]> {
  const rows = await services.read
    .select({
      sequence: custodyEntry.sequence,
      at: custodyEntry.at,
      kind: custodyEntry.kind,
      canonical: custodyEntry.canonical,
    })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, subject.kind),
        eq(custodySubject.subjectId, subject.id),
        inArray(custodyEntry.kind, [...kinds]),
      ),
    )
    .orderBy(desc(custodySubject.sequence))
    .limit(limit);
  return rows.map(({ canonical, ...line }) => ({ ...line, entry: JSON.parse(canonical) as Entry }));
}
