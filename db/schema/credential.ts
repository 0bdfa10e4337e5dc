import { sql } from 'drizzle-orm';
import { index, integer, sqliteTable, text, uniqueIndex } from 'drizzle-orm/sqlite-core';
import { at, id } from './columns';
import { device } from './device';

/** The service's own keys, by which device tokens are signed. The private half is sealed. */
export const signingKey = sqliteTable(
  'signing_key',
  {
    kid: text('kid').primaryKey(),
    algorithm: text('algorithm', { enum: ['EdDSA', 'ES256'] }).notNull(),
    use: text('use', { enum: ['device-token', 'client-token', 'tree-head'] }).notNull(),
    publicJwk: text('public_jwk').notNull(),
    sealedPrivateJwk: text('sealed_private_jwk').notNull(),
    createdAt: at('created_at').notNull(),
    /** No longer signs from here on; still verifies until retiredAt. */
    supersededAt: at('superseded_at'),
    retiredAt: at('retired_at'),
    compromisedAt: at('compromised_at'),
  },
  (t) => [
    uniqueIndex('signing_key_current').on(t.use).where(sql`superseded_at is null and retired_at is null`),
  ],
);

export const CREDENTIAL_STATES = ['issued', 'in-use', 'superseded', 'retired', 'revoked'] as const;

/** A signed API token issued to a device. The token itself is not kept: it is made again from this row. */
export const credential = sqliteTable(
  'credential',
  {
    /** Its `jti`. */
    id: id(),
    /** The name people use: c-9QX2-71. */
    label: text('label').notNull(),
    /** All credentials that descend from one enrolment. */
    familyId: text('family_id').notNull(),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    kid: text('kid')
      .notNull()
      .references(() => signingKey.kid),
    /** RFC 7638 thumbprint it is bound to; null: plain bearer. */
    boundThumbprint: text('bound_thumbprint'),
    state: text('state', { enum: CREDENTIAL_STATES }).notNull(),
    issuedAt: at('issued_at').notNull(),
    expiresAt: at('expires_at').notNull(),
    /** From here on the device is told to renew, by the policy of the day it was issued. */
    renewAfter: at('renew_after'),
    firstUsedAt: at('first_used_at'),
    lastUsedAt: at('last_used_at'),
    /** Overlap: works until its successor is first used, at the latest until here. */
    overlapEndsAt: at('overlap_ends_at'),
    successorId: text('successor_id'),
    predecessorId: text('predecessor_id'),
    /** Somebody asked that it be renewed: the device is told with every answer. */
    renewalAskedAt: at('renewal_asked_at'),
    revokedAt: at('revoked_at'),
    endReason: text('end_reason'),
    version: integer('version').notNull().default(1),
  },
  (t) => [
    index('credential_by_end').on(t.state, t.expiresAt),
    index('credential_by_device').on(t.deviceId, t.issuedAt),
    uniqueIndex('credential_one_successor').on(t.predecessorId).where(sql`predecessor_id is not null`),
  ],
);

/** Proofs seen in their window (RFC 9449, 11.1). */
export const proofSeen = sqliteTable(
  'proof_seen',
  { key: text('key').primaryKey(), expiresAt: at('expires_at').notNull() },
  (t) => [index('proof_seen_by_end').on(t.expiresAt)],
);
