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

/**
 * Hashes of complete subtrees of the Merkle log, so that a proof is a few reads however long the log is: `position`
 * counts the subtrees of 2^level entries from 0. Level 0 are the leaf hashes of the entries themselves and not here.
 * Dense on each level and append-only by triggers; it can be made again from the entries.
 */
export const custodyNode = sqliteTable(
  'custody_node',
  {
    level: integer('level').notNull(),
    position: integer('position').notNull(),
    hash: hash('hash').notNull(),
  },
  (t) => [primaryKey({ columns: [t.level, t.position] })],
);

/** Signed tree heads, each of a larger tree than the one before. Triggers refuse UPDATE, DELETE and REPLACE. */
export const custodyHead = sqliteTable('custody_head', {
  /** Entries in the tree. */
  size: integer('size').primaryKey(),
  root: hash('root').notNull(),
  /** The signed note (C2SP checkpoint), as it is kept everywhere. */
  note: text('note').notNull(),
  kid: text('kid').notNull(),
  madeAt: at('made_at').notNull(),
});

/** That the auditors were sent heads on a day: one row a day, append-only, so that several processes send one letter. */
export const custodyHeadMail = sqliteTable('custody_head_mail', {
  /** YYYY-MM-DD in the hospital's zone. */
  day: text('day').primaryKey(),
  /** Size of the newest head in it. */
  size: integer('size')
    .notNull()
    .references(() => custodyHead.size),
  recipients: integer('recipients').notNull(),
  madeAt: at('made_at').notNull(),
});
