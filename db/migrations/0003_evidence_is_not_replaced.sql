-- REPLACE and UPDATE OR REPLACE delete what they run into, and on a connection without recursive_triggers no delete
-- trigger sees it: each unique key of a recording is guarded at the insert, and its id never changes.
CREATE TRIGGER recording_no_replace BEFORE INSERT ON recording
WHEN EXISTS (SELECT 1 FROM recording WHERE id = NEW.id)
  OR EXISTS (SELECT 1 FROM recording WHERE number = NEW.number)
  OR EXISTS (
    SELECT 1 FROM recording
    WHERE device_id = NEW.device_id AND device_recording_number = NEW.device_recording_number
  )
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: recording'); END;
--> statement-breakpoint
CREATE TRIGGER recording_id_stays BEFORE UPDATE ON recording
WHEN NEW.id IS NOT OLD.id
BEGIN SELECT RAISE(ABORT, 'the id of a recording is not changed'); END;
--> statement-breakpoint
-- Whoever did something, and by which device, stays named.
CREATE TRIGGER user_no_delete BEFORE DELETE ON user
BEGIN SELECT RAISE(ABORT, 'people leave, they are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER user_id_stays BEFORE UPDATE ON user
WHEN NEW.id IS NOT OLD.id
BEGIN SELECT RAISE(ABORT, 'the id of a person is not changed'); END;
--> statement-breakpoint
CREATE TRIGGER user_no_replace BEFORE INSERT ON user
WHEN EXISTS (SELECT 1 FROM user WHERE id = NEW.id) OR EXISTS (SELECT 1 FROM user WHERE email = NEW.email)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: user'); END;
--> statement-breakpoint
CREATE TRIGGER device_no_delete BEFORE DELETE ON device
BEGIN SELECT RAISE(ABORT, 'devices are retired, not removed'); END;
--> statement-breakpoint
CREATE TRIGGER device_id_stays BEFORE UPDATE ON device
WHEN NEW.id IS NOT OLD.id
BEGIN SELECT RAISE(ABORT, 'the id of a device is not changed'); END;
--> statement-breakpoint
CREATE TRIGGER device_no_replace BEFORE INSERT ON device
WHEN EXISTS (SELECT 1 FROM device WHERE id = NEW.id)
  OR EXISTS (SELECT 1 FROM device WHERE asset_tag = NEW.asset_tag)
  OR EXISTS (SELECT 1 FROM device WHERE model_id = NEW.model_id AND serial_number = NEW.serial_number)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: device'); END;
