import { index, integer, primaryKey, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, id, json } from './columns';

/** The hospital's limits for verdicts. A new version is a new row; nothing is judged anew by it silently. */
export const policy = sqliteTable('policy', {
  version: integer('version').primaryKey(),
  limits: json('limits', z.record(z.string(), z.unknown())).notNull(),
  madeBy: text('made_by'),
  madeAt: at('made_at').notNull(),
  note: text('note'),
});

/** What the hospital has decided, by kind (lib/policy/kinds.ts). A change is a new row; triggers refuse to rewrite one. */
export const policyVersion = sqliteTable(
  'policy_version',
  {
    kind: text('kind').notNull(),
    version: integer('version').notNull(),
    settings: json('settings', z.record(z.string(), z.unknown())).notNull(),
    reason: text('reason').notNull(),
    madeBy: text('made_by').notNull(),
    madeAt: at('made_at').notNull(),
  },
  (t) => [primaryKey({ columns: [t.kind, t.version] })],
);

/** A write's answer by its idempotency key, so that a repeat gets the same answer and changes nothing. */
export const idempotencyKey = sqliteTable(
  'idempotency_key',
  {
    /** Actor, route and key joined. */
    key: text('key').primaryKey(),
    requestHash: text('request_hash').notNull(),
    status: integer('status').notNull(),
    body: text('body').notNull(),
    createdAt: at('created_at').notNull(),
  },
  (t) => [index('idempotency_key_by_time').on(t.createdAt)],
);

/** Work that must happen after a commit, and survive a restart: mail, clean-ups. */
export const outbox = sqliteTable(
  'outbox',
  {
    id: id(),
    kind: text('kind').notNull(),
    payload: json('payload', z.record(z.string(), z.unknown())).notNull(),
    createdAt: at('created_at').notNull(),
    dueAt: at('due_at').notNull(),
    leasedUntil: at('leased_until'),
    tries: integer('tries').notNull().default(0),
    lastError: text('last_error'),
    doneAt: at('done_at'),
    deadAt: at('dead_at'),
  },
  (t) => [index('outbox_due').on(t.doneAt, t.deadAt, t.dueAt)],
);
