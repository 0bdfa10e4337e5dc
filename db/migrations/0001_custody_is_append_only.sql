-- The database refuses to rewrite history. REPLACE deletes before it inserts: the insert guards stop it even on a
-- connection without recursive_triggers.
CREATE TRIGGER custody_entry_no_update BEFORE UPDATE ON custody_entry
BEGIN SELECT RAISE(ABORT, 'custody entries are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_entry_no_delete BEFORE DELETE ON custody_entry
BEGIN SELECT RAISE(ABORT, 'custody entries are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_entry_no_replace BEFORE INSERT ON custody_entry
WHEN EXISTS (SELECT 1 FROM custody_entry WHERE sequence = NEW.sequence)
BEGIN SELECT RAISE(ABORT, 'custody entries are not replaced'); END;
--> statement-breakpoint
CREATE TRIGGER custody_entry_dense BEFORE INSERT ON custody_entry
WHEN NEW.sequence IS NOT (SELECT coalesce(max(sequence) + 1, 0) FROM custody_entry)
BEGIN SELECT RAISE(ABORT, 'custody sequence numbers are dense'); END;
--> statement-breakpoint
CREATE TRIGGER custody_subject_no_update BEFORE UPDATE ON custody_subject
BEGIN SELECT RAISE(ABORT, 'custody subjects are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_subject_no_delete BEFORE DELETE ON custody_subject
BEGIN SELECT RAISE(ABORT, 'custody subjects are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_subject_no_replace BEFORE INSERT ON custody_subject
WHEN EXISTS (
  SELECT 1 FROM custody_subject
  WHERE subject_kind = NEW.subject_kind AND subject_id = NEW.subject_id AND sequence = NEW.sequence
)
BEGIN SELECT RAISE(ABORT, 'custody subjects are not replaced'); END;
--> statement-breakpoint
-- A filing is superseded, never deleted, and only once.
CREATE TRIGGER filing_no_delete BEFORE DELETE ON filing
BEGIN SELECT RAISE(ABORT, 'filings are superseded, not removed'); END;
--> statement-breakpoint
CREATE TRIGGER filing_only_superseded BEFORE UPDATE ON filing
WHEN OLD.superseded_at IS NOT NULL
  OR NEW.id IS NOT OLD.id OR NEW.recording_id IS NOT OLD.recording_id OR NEW.encounter_id IS NOT OLD.encounter_id
  OR NEW.patient_id IS NOT OLD.patient_id OR NEW."by" IS NOT OLD."by" OR NEW.filed_at IS NOT OLD.filed_at
  OR NEW.session_id IS NOT OLD.session_id OR NEW.person_id IS NOT OLD.person_id OR NEW.reason IS NOT OLD.reason
BEGIN SELECT RAISE(ABORT, 'a filing changes only by being superseded'); END;
--> statement-breakpoint
CREATE TRIGGER filing_no_replace BEFORE INSERT ON filing
WHEN EXISTS (SELECT 1 FROM filing WHERE id = NEW.id)
  OR (NEW.superseded_at IS NULL AND EXISTS (SELECT 1 FROM filing WHERE recording_id = NEW.recording_id AND superseded_at IS NULL))
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: filing.recording_id'); END;
--> statement-breakpoint
CREATE TRIGGER recording_no_delete BEFORE DELETE ON recording
BEGIN SELECT RAISE(ABORT, 'recordings are not removed'); END;
--> statement-breakpoint
-- What was sealed stays what it was.
CREATE TRIGGER recording_sealed_stays BEFORE UPDATE ON recording
WHEN NEW.declared_sha256 IS NOT OLD.declared_sha256 OR NEW.declared_bytes IS NOT OLD.declared_bytes
  OR NEW.device_id IS NOT OLD.device_id OR NEW.device_recording_number IS NOT OLD.device_recording_number
  OR NEW.number IS NOT OLD.number
  OR (OLD.sealed_at IS NOT NULL AND (NEW.sealed_at IS NOT OLD.sealed_at OR NEW.original_key IS NOT OLD.original_key))
BEGIN SELECT RAISE(ABORT, 'the sealed original of a recording is not changed'); END;
