import { index, integer, primaryKey, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { at, hash } from './columns';

/**
 * One immutable line of what happened. Sequence numbers are dense from 0 and are the leaf indexes of the Merkle
 * log; `canonical` is the entry as RFC 8785 JSON, whose RFC 6962 leaf hash stands beside it. Triggers refuse
 * UPDATE, DELETE and REPLACE.
 */
export const custodyEntry = sqliteTable(
  'custody_entry',
  {
    sequence: integer('sequence').primaryKey(),
    at: at('at').notNull(),
    kind: text('kind').notNull(),
    actorKind: text('actor_kind', { enum: ['person', 'device', 'service'] }).notNull(),
    actorId: text('actor_id').notNull(),
    canonical: text('canonical').notNull(),
    leafHash: hash('leaf_hash').notNull(),
  },
  (t) => [
    index('custody_entry_by_time').on(t.at),
    index('custody_entry_by_kind').on(t.kind, t.sequence),
    index('custody_entry_by_actor').on(t.actorKind, t.actorId, t.sequence),
  ],
);

/** Which entries speak of whom: the index behind every thread. It can be made again from the entries. */
export const custodySubject = sqliteTable(
  'custody_subject',
  {
    subjectKind: text('subject_kind').notNull(),
    subjectId: text('subject_id').notNull(),
    sequence: integer('sequence')
      .notNull()
      .references(() => custodyEntry.sequence),
  },
  (t) => [primaryKey({ columns: [t.subjectKind, t.subjectId, t.sequence] })],
);
