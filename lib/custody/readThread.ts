import { and, asc, desc, eq, gte, inArray, lt, type SQL, sql } from 'drizzle-orm';
import { custodyEntry, custodySubject } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import type { Entry, EntryKind, Subject } from './entry';
import { hex } from './pure/hash';

/** An entry as it is shown and checked: parsed, and as the very text its leaf hash is over. */
export interface ThreadEntry {
  sequence: number;
  at: number;
  kind: EntryKind;
  entry: Entry;
  canonical: string;
  leafHash: string;
}

type Row = Pick<typeof custodyEntry.$inferSelect, 'sequence' | 'at' | 'kind' | 'canonical' | 'leafHash'>;
const columns = {
  sequence: custodyEntry.sequence,
  at: custodyEntry.at,
  kind: custodyEntry.kind,
  canonical: custodyEntry.canonical,
  leafHash: custodyEntry.leafHash,
};

const shown = (row: Row): ThreadEntry => ({
  sequence: row.sequence,
  at: row.at,
  kind: row.kind as EntryKind,
  entry: JSON.parse(row.canonical) as Entry,
  canonical: row.canonical,
  leafHash: hex(row.leafHash),
});

export interface Page {
  rows: ThreadEntry[];
  /** Sequence number to go on from, or null at the end. */
  next: number | null;
}

const page = (rows: Row[], limit: number): Page => ({
  rows: rows.slice(0, limit).map(shown),
  next: rows.length > limit ? (rows[limit - 1]?.sequence ?? null) : null,
});

/**
 * All entries that speak of one subject, newest first, a page at a time. The caller has checked that the person may
 * see that subject.
 *
 * @param options.before sequence number of the last row of the page before
 */
export async function readThread(
  services: Pick<Services, 'read'>,
  subject: Subject,
  options: { before?: number | undefined; limit?: number } = {},
): Promise<Page> {
  const limit = options.limit ?? 100;
  const rows = await services.read
    .select(columns)
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(
      and(
        eq(custodySubject.subjectKind, subject.kind),
        eq(custodySubject.subjectId, subject.id),
        options.before === undefined ? undefined : lt(custodySubject.sequence, options.before),
      ),
    )
    .orderBy(desc(custodySubject.sequence))
    .limit(limit + 1);
  return page(rows, limit);
}

/** How many entries speak of a subject, and the first and last of them (UTC ms). */
export async function threadExtent(services: Pick<Services, 'read'>, subject: Subject) {
  const [row] = await services.read
    .select({
      count: sql<number>`count(*)`,
      first: sql<number | null>`min(${custodyEntry.at})`,
      last: sql<number | null>`max(${custodyEntry.at})`,
    })
    .from(custodySubject)
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(and(eq(custodySubject.subjectKind, subject.kind), eq(custodySubject.subjectId, subject.id)));
  return { count: row?.count ?? 0, first: row?.first ?? null, last: row?.last ?? null };
}

export interface LedgerQuery {
  kinds?: EntryKind[] | undefined;
  /** Any of these subjects. */
  subjects?: Subject[] | undefined;
  actor?: { kind: 'person' | 'device' | 'service'; id: string } | undefined;
  fromMs?: number | undefined;
  toMs?: number | undefined;
  before?: number | undefined;
  limit?: number | undefined;
}

/** Entries of the whole ledger, newest first, a page at a time; every filter is served by an index. */
export async function readLedger(services: Pick<Services, 'read'>, query: LedgerQuery): Promise<Page> {
  const limit = query.limit ?? 100;
  const where: (SQL | undefined)[] = [
    query.before === undefined ? undefined : lt(custodyEntry.sequence, query.before),
    query.kinds?.length ? inArray(custodyEntry.kind, query.kinds) : undefined,
    query.actor
      ? and(eq(custodyEntry.actorKind, query.actor.kind), eq(custodyEntry.actorId, query.actor.id))
      : undefined,
    query.fromMs === undefined ? undefined : gte(custodyEntry.at, query.fromMs),
    query.toMs === undefined ? undefined : lt(custodyEntry.at, query.toMs),
  ];
  if (query.subjects) {
    if (query.subjects.length === 0) return { rows: [], next: null };
    const named = query.subjects.map((s) => sql`(${s.kind}, ${s.id})`);
    where.push(
      sql`${custodyEntry.sequence} in (select ${custodySubject.sequence} from ${custodySubject} where (${custodySubject.subjectKind}, ${custodySubject.subjectId}) in (values ${sql.join(named, sql`, `)}))`,
    );
  }
  const rows = await services.read
    .select(columns)
    .from(custodyEntry)
    .where(and(...where))
    .orderBy(desc(custodyEntry.sequence))
    .limit(limit + 1);
  return page(rows, limit);
}

/** Size of the log: the next sequence number. */
export async function logSize(services: Pick<Services, 'read'>): Promise<number> {
  const [row] = await services.read
    .select({ size: sql<number>`coalesce(max(${custodyEntry.sequence}) + 1, 0)` })
    .from(custodyEntry);
  return row?.size ?? 0;
}

/** Entries from a sequence number on, oldest first: what live pages follow. */
export async function entriesFrom(
  services: Pick<Services, 'read'>,
  from: number,
  limit: number,
): Promise<ThreadEntry[]> {
  const rows = await services.read
    .select(columns)
    .from(custodyEntry)
    .where(gte(custodyEntry.sequence, from))
    .orderBy(asc(custodyEntry.sequence))
    .limit(limit);
  return rows.map(shown);
}
