import { index, integer, primaryKey, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, id, json } from './columns';
import { credential } from './credential';
import { device } from './device';

export const RUN_STATES = ['running', 'paused', 'ended', 'cancelled'] as const;

/** Whose credentials a rotation run renews, as it was chosen; what it hit is in its members. */
export const RotationSelection = z.strictObject({
  wardId: z.string().nullable(),
  modelId: z.string().nullable(),
  firmware: z.string().nullable(),
  /** Ending before this, UTC ms. */
  endingBefore: z.number().int().nullable(),
});
export type RotationSelection = z.infer<typeof RotationSelection>;

/** One act of renewing many credentials. */
export const rotationRun = sqliteTable(
  'rotation_run',
  {
    id: id(),
    label: text('label').notNull().unique(),
    state: text('state', { enum: RUN_STATES }).notNull(),
    reason: text('reason').notNull(),
    selection: json('selection', RotationSelection).notNull(),
    /** So many devices are told at once, and the next so many after the pause. */
    waveSize: integer('wave_size').notNull(),
    wavePauseMs: integer('wave_pause_ms').notNull(),
    nextWaveAt: at('next_wave_at').notNull(),
    deadlineAt: at('deadline_at').notNull(),
    /** What happens to those who miss the deadline. */
    atDeadline: text('at_deadline', { enum: ['keep', 'revoke'] }).notNull(),
    startedBy: text('started_by').notNull(),
    startedAt: at('started_at').notNull(),
    endedAt: at('ended_at'),
    version: integer('version').notNull().default(1),
  },
  (t) => [index('rotation_run_by_start').on(t.startedAt), index('rotation_run_by_state').on(t.state)],
);

export const MEMBER_STATES = ['waiting', 'asked', 'done', 'missed', 'left-out'] as const;

/** One credential of a run: not told yet, told, its successor in use, missed the deadline, or ended otherwise. */
export const rotationMember = sqliteTable(
  'rotation_member',
  {
    runId: text('run_id')
      .notNull()
      .references(() => rotationRun.id),
    credentialId: text('credential_id')
      .notNull()
      .references(() => credential.id),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    state: text('state', { enum: MEMBER_STATES }).notNull(),
    askedAt: at('asked_at'),
    endedAt: at('ended_at'),
  },
  (t) => [
    primaryKey({ columns: [t.runId, t.credentialId] }),
    index('rotation_member_by_state').on(t.runId, t.state, t.credentialId),
    index('rotation_member_by_credential').on(t.credentialId),
  ],
);
