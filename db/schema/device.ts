import { sql } from 'drizzle-orm';
import { index, integer, real, sqliteTable, text, uniqueIndex } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, id, json } from './columns';
import { ward } from './ward';

/** A maker's model with what its recordings should be. */
export const deviceModel = sqliteTable('device_model', {
  id: id(),
  maker: text('maker').notNull(),
  name: text('name').notNull().unique(),
  sampleRatesHz: json('sample_rates_hz', z.array(z.number().positive())).notNull(),
  bitDepths: json('bit_depths', z.array(z.number().int())).notNull(),
  mediaTypes: json('media_types', z.array(z.string())).notNull(),
  allowLossy: integer('allow_lossy', { mode: 'boolean' }).notNull().default(false),
  longestClipSeconds: real('longest_clip_seconds').notNull(),
  fullScaleNote: text('full_scale_note'),
  checkIntervalDays: integer('check_interval_days').notNull(),
  /** Can sign requests with a key of its own; where not, its credential is a plain bearer token and marked weaker. */
  signsRequests: integer('signs_requests', { mode: 'boolean' }).notNull().default(true),
  createdAt: at('created_at').notNull(),
  /** Row version for stale-page checks. */
  version: integer('version').notNull().default(1),
});

export const SERVICE_STATES = [
  'waiting',
  'in-service',
  'quarantined',
  'in-repair',
  'lost',
  'retired',
] as const;

export const device = sqliteTable(
  'device',
  {
    id: id(),
    assetTag: text('asset_tag').notNull().unique(),
    serialNumber: text('serial_number').notNull(),
    udi: text('udi'),
    lot: text('lot'),
    modelId: text('model_id')
      .notNull()
      .references(() => deviceModel.id),
    wardId: text('ward_id').references(() => ward.id),
    firmware: text('firmware'),
    state: text('state', { enum: SERVICE_STATES }).notNull(),
    stateReason: text('state_reason'),
    /** RFC 7638 SHA-256 thumbprint of the key it enrolled with, base64url. */
    keyThumbprint: text('key_thumbprint'),
    publicJwk: json('public_jwk', z.record(z.string(), z.unknown())),
    enrolledAt: at('enrolled_at'),
    lastHeardAt: at('last_heard_at'),
    batteryPercent: integer('battery_percent'),
    /** Device clock minus ours at the last report, ms. */
    clockOffsetMs: integer('clock_offset_ms'),
    lastCheckAt: at('last_check_at'),
    checkDueAt: at('check_due_at'),
    createdAt: at('created_at').notNull(),
    version: integer('version').notNull().default(1),
  },
  (t) => [
    uniqueIndex('device_by_serial').on(t.modelId, t.serialNumber),
    index('device_by_ward').on(t.wardId),
    index('device_by_state').on(t.state, t.assetTag),
    index('device_by_heard').on(t.lastHeardAt),
  ],
);

/** A one-time code by which a physical device proves that it is the one on the list. */
export const enrolmentCode = sqliteTable(
  'enrolment_code',
  {
    id: id(),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    /** HMAC-SHA-256 of the code under a key of the service, hex. The code itself is shown once and kept nowhere. */
    codeHash: text('code_hash').notNull(),
    createdBy: text('created_by').notNull(),
    createdAt: at('created_at').notNull(),
    expiresAt: at('expires_at').notNull(),
    triesLeft: integer('tries_left').notNull(),
    usedAt: at('used_at'),
    withdrawnAt: at('withdrawn_at'),
    /** What was answered when it was used: a device whose answer was lost asks again with the same key. */
    credentialId: text('credential_id'),
  },
  (t) => [
    index('enrolment_code_by_device').on(t.deviceId),
    uniqueIndex('enrolment_code_open').on(t.deviceId).where(sql`used_at is null and withdrawn_at is null`),
  ],
);

export const firmwareChange = sqliteTable(
  'firmware_change',
  {
    id: id(),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    from: text('from_version'),
    to: text('to_version').notNull(),
    at: at('at').notNull(),
  },
  (t) => [index('firmware_change_by_device').on(t.deviceId, t.at)],
);
