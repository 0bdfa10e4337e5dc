import { index, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { at, id } from './columns';
import { user } from './identity';
import { ward } from './ward';

/** Mirror of the record system's Patient (FHIR R4). Never edited here. */
export const patient = sqliteTable('patient', {
  id: id(),
  /** The hospital's record number, as on the wristband. */
  recordNumber: text('record_number').notNull().unique(),
  familyName: text('family_name').notNull(),
  givenName: text('given_name').notNull(),
  /** YYYY-MM-DD, or a partial date as FHIR allows. */
  birthDate: text('birth_date'),
  sex: text('sex'),
  fhirId: text('fhir_id'),
  updatedAt: at('updated_at').notNull(),
});

/** Mirror of the record system's Encounter (FHIR R4). */
export const encounter = sqliteTable(
  'encounter',
  {
    id: id(),
    /** E-55120 */
    number: text('number').notNull().unique(),
    patientId: text('patient_id')
      .notNull()
      .references(() => patient.id),
    wardId: text('ward_id').references(() => ward.id),
    bed: text('bed'),
    status: text('status', { enum: ['planned', 'in-progress', 'finished', 'cancelled'] }).notNull(),
    class: text('class'),
    startedAt: at('started_at').notNull(),
    endedAt: at('ended_at'),
    fhirId: text('fhir_id'),
    updatedAt: at('updated_at').notNull(),
  },
  (t) => [
    index('encounter_by_ward').on(t.wardId, t.status, t.startedAt),
    index('encounter_by_patient').on(t.patientId),
  ],
);

/** A reason given to look at a patient outside one's wards. Shown to the auditor. */
export const accessReason = sqliteTable(
  'access_reason',
  {
    id: id(),
    personId: text('person_id')
      .notNull()
      .references(() => user.id),
    patientId: text('patient_id')
      .notNull()
      .references(() => patient.id),
    reason: text('reason').notNull(),
    givenAt: at('given_at').notNull(),
    expiresAt: at('expires_at').notNull(),
  },
  (t) => [index('access_reason_by_person').on(t.personId, t.patientId, t.expiresAt)],
);
