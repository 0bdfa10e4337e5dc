import { index, integer, sqliteTable, text, uniqueIndex } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, id, json } from './columns';
import { user } from './identity';

/** Another system that reads from us with a token of its own (RFC 6749, 4.4). */
export const apiClient = sqliteTable(
  'api_client',
  {
    id: id(),
    name: text('name').notNull(),
    scopes: json('scopes', z.array(z.string())).notNull(),
    method: text('method', { enum: ['client_secret_basic', 'private_key_jwt'] }).notNull(),
    /** SHA-256 of the secret, hex: it holds 256 random bits, so a slow hash would add nothing. */
    secretHash: text('secret_hash'),
    /** The one before it, while both work. */
    previousSecretHash: text('previous_secret_hash'),
    previousEndsAt: at('previous_ends_at'),
    /** A key set (RFC 7517) of public keys for private_key_jwt. */
    publicKeys: json('public_keys', z.object({ keys: z.array(z.record(z.string(), z.unknown())) })),
    createdBy: text('created_by')
      .notNull()
      .references(() => user.id),
    createdAt: at('created_at').notNull(),
    lastUsedAt: at('last_used_at'),
    revokedAt: at('revoked_at'),
    version: integer('version').notNull().default(1),
  },
  (t) => [index('api_client_by_time').on(t.createdAt, t.id)],
);

/** An address of another system that is told what happened. */
export const webhook = sqliteTable(
  'webhook',
  {
    id: id(),
    name: text('name').notNull(),
    url: text('url').notNull(),
    events: json('events', z.array(z.string())).notNull(),
    sealedSecret: text('sealed_secret').notNull(),
    /** The secret before it, which signs too until its end. */
    sealedPreviousSecret: text('sealed_previous_secret'),
    previousEndsAt: at('previous_ends_at'),
    pausedAt: at('paused_at'),
    removedAt: at('removed_at'),
    createdBy: text('created_by')
      .notNull()
      .references(() => user.id),
    createdAt: at('created_at').notNull(),
    version: integer('version').notNull().default(1),
  },
  (t) => [index('webhook_by_time').on(t.createdAt, t.id)],
);

/** One event for one address. Its `id` is that of the piece of outbox work that delivers it. */
export const webhookDelivery = sqliteTable(
  'webhook_delivery',
  {
    id: id(),
    webhookId: text('webhook_id')
      .notNull()
      .references(() => webhook.id),
    /** The same for every address that hears of this event. */
    eventId: text('event_id').notNull(),
    type: text('type').notNull(),
    /** What is sent, byte for byte. */
    body: text('body').notNull(),
    createdAt: at('created_at').notNull(),
    triedAt: at('tried_at'),
    /** HTTP status of the last answer; null: none. */
    status: integer('status'),
    failure: text('failure'),
  },
  (t) => [
    uniqueIndex('webhook_delivery_once').on(t.webhookId, t.eventId),
    index('webhook_delivery_by_time').on(t.webhookId, t.createdAt, t.id),
  ],
);

/** How far the custody log was told to webhooks. */
export const webhookCursor = sqliteTable('webhook_cursor', {
  id: text('id', { enum: ['log'] }).primaryKey(),
  sequence: integer('sequence').notNull(),
});
