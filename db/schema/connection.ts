import { integer, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, json } from './columns';
import { user } from './identity';

/** How the house reaches other systems, where it was set in the Key room; the secret is sealed. */
export const connectionSetting = sqliteTable('connection_setting', {
  kind: text('kind', { enum: ['record-system', 'single-sign-on'] }).primaryKey(),
  settings: json('settings', z.record(z.string(), z.unknown())).notNull(),
  sealedSecret: text('sealed_secret'),
  changedBy: text('changed_by')
    .notNull()
    .references(() => user.id),
  changedAt: at('changed_at').notNull(),
  version: integer('version').notNull().default(1),
});

/** What the last test of a connection found. */
export const connectionCheck = sqliteTable('connection_check', {
  kind: text('kind', { enum: ['storage', 'mail', 'record-system', 'single-sign-on'] }).primaryKey(),
  ok: integer('ok', { mode: 'boolean' }).notNull(),
  steps: json(
    'steps',
    z.array(z.object({ name: z.string(), ok: z.boolean(), detail: z.string() })),
  ).notNull(),
  checkedBy: text('checked_by')
    .notNull()
    .references(() => user.id),
  checkedAt: at('checked_at').notNull(),
});
