import { sql } from 'drizzle-orm';
import { index, integer, primaryKey, real, sqliteTable, text, uniqueIndex } from 'drizzle-orm/sqlite-core';
import { z } from 'zod';
import { at, id, json } from './columns';
import { device, deviceModel } from './device';
import { user } from './identity';
import { encounter, patient } from './patient';

/** Where the recording stands on its passage: the last step that is committed. */
export const STAGES = ['awaited', 'received', 'sealed', 'measured', 'filed'] as const;

/** Loose on purpose: measures of an older version stay readable; what is used is parsed by the contract's schema. */
const Json = z.record(z.string(), z.unknown());

export const recording = sqliteTable(
  'recording',
  {
    id: id(),
    /** The number people read aloud: 7K3F-92QX. */
    number: text('number').notNull().unique(),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    modelId: text('model_id')
      .notNull()
      .references(() => deviceModel.id),
    credentialId: text('credential_id'),
    /** The device's own number for it: its idempotency key. */
    deviceRecordingNumber: text('device_recording_number').notNull(),
    stage: text('stage', { enum: STAGES }).notNull(),
    /** Why the passage was cut, as a problem code; null while it runs or is done. */
    stopped: text('stopped'),

    declaredSha256: text('declared_sha256').notNull(),
    declaredBytes: integer('declared_bytes').notNull(),
    mediaType: text('media_type').notNull(),
    /** By the device's own clock, and corrected by what its clock said when it asked for the slot. */
    recordedAtDevice: at('recorded_at_device').notNull(),
    recordedAt: at('recorded_at').notNull(),
    clockOffsetMs: integer('clock_offset_ms').notNull(),
    site: text('site'),
    chestpieceSide: text('chestpiece_side', { enum: ['bell', 'diaphragm'] }),
    gainStep: integer('gain_step'),
    filter: text('filter'),
    firmware: text('firmware'),
    /** What the device scanned: a record number, wristband or encounter number. */
    scannedIdentifier: text('scanned_identifier'),
    /** SHA-256 over the whole slot request: the same number with other content is refused. */
    requestHash: text('request_hash').notNull(),

    slotKey: text('slot_key').notNull(),
    slotExpiresAt: at('slot_expires_at').notNull(),
    awaitedAt: at('awaited_at').notNull(),
    receivedAt: at('received_at'),
    sealedAt: at('sealed_at'),
    measuredAt: at('measured_at'),
    filedAt: at('filed_at'),

    originalKey: text('original_key'),
    lockedUntil: at('locked_until'),
    lockKind: text('lock_kind', { enum: ['compliance', 'none'] }),

    verdict: text('verdict', { enum: ['usable', 'care', 'repeat'] }),
    policyVersion: integer('policy_version'),
    findings: json('findings', z.array(Json)),
    measures: json('measures', Json),
    facts: json('facts', Json),
    metadata: json('metadata', Json),
    durationSeconds: real('duration_seconds'),
    sampleRateHz: real('sample_rate_hz'),
    /** Per-clip figures the fleet's control charts are drawn from. */
    noiseFloorDbfs: real('noise_floor_dbfs'),
    activeLevelDbfs: real('active_level_dbfs'),
    dcFraction: real('dc_fraction'),

    /** "Keep anyway": a person's reason to keep a clip that should be recorded again. */
    keptReason: text('kept_reason'),
    keptBy: text('kept_by').references(() => user.id),
    keptAt: at('kept_at'),
    version: integer('version').notNull().default(1),
  },
  (t) => [
    uniqueIndex('recording_by_device_number').on(t.deviceId, t.deviceRecordingNumber),
    index('recording_by_device').on(t.deviceId, t.awaitedAt),
    index('recording_by_time').on(t.awaitedAt, t.id),
    index('recording_unfinished')
      .on(t.stage, t.awaitedAt)
      .where(sql`stopped is null and stage in ('awaited','received','sealed')`),
    index('recording_in_tray').on(t.measuredAt).where(sql`stage = 'measured' and stopped is null`),
  ],
);

/** A picture or list derived from an original; carries the hash of its input and its own. */
export const derivedObject = sqliteTable(
  'derived_object',
  {
    recordingId: text('recording_id')
      .notNull()
      .references(() => recording.id),
    kind: text('kind', { enum: ['peaks', 'spectrogram'] }).notNull(),
    key: text('key').notNull(),
    sha256: text('sha256').notNull(),
    inputSha256: text('input_sha256').notNull(),
    bytes: integer('bytes').notNull(),
    madeAt: at('made_at').notNull(),
  },
  (t) => [primaryKey({ columns: [t.recordingId, t.kind] })],
);

/** "This device is with this patient from now on." */
export const listeningSession = sqliteTable(
  'listening_session',
  {
    id: id(),
    /** S-2093 */
    number: text('number').notNull().unique(),
    deviceId: text('device_id')
      .notNull()
      .references(() => device.id),
    encounterId: text('encounter_id')
      .notNull()
      .references(() => encounter.id),
    openedBy: text('opened_by')
      .notNull()
      .references(() => user.id),
    openedAt: at('opened_at').notNull(),
    closedAt: at('closed_at'),
    closedBy: text('closed_by'),
    closedWhy: text('closed_why', { enum: ['ended', 'device-moved', 'timeout', 'device-lost'] }),
  },
  (t) => [
    uniqueIndex('listening_session_open').on(t.deviceId).where(sql`closed_at is null`),
    index('listening_session_by_encounter').on(t.encounterId, t.openedAt),
    index('listening_session_by_device').on(t.deviceId, t.openedAt),
  ],
);

/** The link from a recording to an encounter. Superseded, never deleted. */
export const filing = sqliteTable(
  'filing',
  {
    id: id(),
    recordingId: text('recording_id')
      .notNull()
      .references(() => recording.id),
    encounterId: text('encounter_id')
      .notNull()
      .references(() => encounter.id),
    patientId: text('patient_id')
      .notNull()
      .references(() => patient.id),
    by: text('by', { enum: ['session', 'identifier', 'person'] }).notNull(),
    sessionId: text('session_id').references(() => listeningSession.id),
    personId: text('person_id').references(() => user.id),
    reason: text('reason'),
    filedAt: at('filed_at').notNull(),
    supersededAt: at('superseded_at'),
    supersededBy: text('superseded_by'),
  },
  (t) => [
    uniqueIndex('filing_current').on(t.recordingId).where(sql`superseded_at is null`),
    index('filing_by_encounter').on(t.encounterId, t.filedAt),
    index('filing_by_patient').on(t.patientId, t.filedAt),
  ],
);
