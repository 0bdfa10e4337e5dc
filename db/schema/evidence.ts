import { index, integer, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { at, id } from './columns';
import { user } from './identity';
import { recording } from './recording';

/**
 * Somebody wants to take a recording's evidence away, for a reason. Decided once: at once where policy asks for no
 * second person, else by somebody who is not the one who asks.
 */
export const evidenceRequest = sqliteTable(
  'evidence_request',
  {
    id: id(),
    recordingId: text('recording_id')
      .notNull()
      .references(() => recording.id),
    reason: text('reason').notNull(),
    askedBy: text('asked_by')
      .notNull()
      .references(() => user.id),
    askedAt: at('asked_at').notNull(),
    decision: text('decision', { enum: ['not-needed', 'approved', 'refused'] }),
    decidedBy: text('decided_by').references(() => user.id),
    decidedAt: at('decided_at'),
  },
  (t) => [
    index('evidence_request_by_recording').on(t.recordingId, t.askedAt),
    index('evidence_request_by_time').on(t.askedAt, t.id),
  ],
);

/** Whether evidence packages need a second person. The row with the highest version counts; none: not needed. */
export const evidencePolicy = sqliteTable('evidence_policy', {
  version: integer('version').primaryKey(),
  secondPerson: integer('second_person', { mode: 'boolean' }).notNull(),
  madeBy: text('made_by').references(() => user.id),
  madeAt: at('made_at').notNull(),
});
