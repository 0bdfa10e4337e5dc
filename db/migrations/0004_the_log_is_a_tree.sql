CREATE TABLE `custody_head` (
	`size` integer PRIMARY KEY NOT NULL,
	`root` blob NOT NULL CHECK(length(`root`) = 32),
	`note` text NOT NULL,
	`kid` text NOT NULL,
	`made_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE TABLE `custody_head_mail` (
	`day` text PRIMARY KEY NOT NULL,
	`size` integer NOT NULL,
	`recipients` integer NOT NULL,
	`made_at` integer NOT NULL,
	FOREIGN KEY (`size`) REFERENCES `custody_head`(`size`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `custody_node` (
	`level` integer NOT NULL,
	`position` integer NOT NULL,
	`hash` blob NOT NULL CHECK(length(`hash`) = 32),
	PRIMARY KEY(`level`, `position`)
) STRICT, WITHOUT ROWID;
--> statement-breakpoint
CREATE TABLE `evidence_policy` (
	`version` integer PRIMARY KEY NOT NULL,
	`second_person` integer NOT NULL,
	`made_by` text,
	`made_at` integer NOT NULL,
	FOREIGN KEY (`made_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `evidence_request` (
	`id` text PRIMARY KEY NOT NULL,
	`recording_id` text NOT NULL,
	`reason` text NOT NULL,
	`asked_by` text NOT NULL,
	`asked_at` integer NOT NULL,
	`decision` text,
	`decided_by` text,
	`decided_at` integer,
	FOREIGN KEY (`recording_id`) REFERENCES `recording`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`asked_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`decided_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `evidence_request_by_recording` ON `evidence_request` (`recording_id`,`asked_at`);--> statement-breakpoint
CREATE INDEX `evidence_request_by_time` ON `evidence_request` (`asked_at`,`id`);
--> statement-breakpoint
CREATE TRIGGER custody_node_no_update BEFORE UPDATE ON custody_node
BEGIN SELECT RAISE(ABORT, 'subtrees of the log are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_node_no_delete BEFORE DELETE ON custody_node
BEGIN SELECT RAISE(ABORT, 'subtrees of the log are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_node_no_replace BEFORE INSERT ON custody_node
WHEN EXISTS (SELECT 1 FROM custody_node WHERE level = NEW.level AND position = NEW.position)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: custody_node'); END;
--> statement-breakpoint
-- A level without a gap: what is counted is there.
CREATE TRIGGER custody_node_dense BEFORE INSERT ON custody_node
WHEN NEW.level < 1 OR NEW.position IS NOT (SELECT coalesce(max(position) + 1, 0) FROM custody_node WHERE level = NEW.level)
BEGIN SELECT RAISE(ABORT, 'subtrees of the log are dense'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_no_update BEFORE UPDATE ON custody_head
BEGIN SELECT RAISE(ABORT, 'tree heads are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_no_delete BEFORE DELETE ON custody_head
BEGIN SELECT RAISE(ABORT, 'tree heads are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_no_replace BEFORE INSERT ON custody_head
WHEN EXISTS (SELECT 1 FROM custody_head WHERE size = NEW.size)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: custody_head'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_grows BEFORE INSERT ON custody_head
WHEN NEW.size <= (SELECT coalesce(max(size), 0) FROM custody_head)
  OR NEW.size > (SELECT coalesce(max(sequence) + 1, 0) FROM custody_entry)
BEGIN SELECT RAISE(ABORT, 'a tree head is of a larger tree than the one before'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_mail_no_update BEFORE UPDATE ON custody_head_mail
BEGIN SELECT RAISE(ABORT, 'letters of tree heads are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_mail_no_delete BEFORE DELETE ON custody_head_mail
BEGIN SELECT RAISE(ABORT, 'letters of tree heads are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER custody_head_mail_no_replace BEFORE INSERT ON custody_head_mail
WHEN EXISTS (SELECT 1 FROM custody_head_mail WHERE day = NEW.day)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: custody_head_mail'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_policy_no_update BEFORE UPDATE ON evidence_policy
BEGIN SELECT RAISE(ABORT, 'policies are not changed'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_policy_no_delete BEFORE DELETE ON evidence_policy
BEGIN SELECT RAISE(ABORT, 'policies are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_policy_no_replace BEFORE INSERT ON evidence_policy
WHEN EXISTS (SELECT 1 FROM evidence_policy WHERE version = NEW.version)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: evidence_policy'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_request_no_delete BEFORE DELETE ON evidence_request
BEGIN SELECT RAISE(ABORT, 'requests for evidence are not removed'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_request_decided_once BEFORE UPDATE ON evidence_request
WHEN OLD.decision IS NOT NULL OR NEW.id IS NOT OLD.id OR NEW.recording_id IS NOT OLD.recording_id
  OR NEW.reason IS NOT OLD.reason OR NEW.asked_by IS NOT OLD.asked_by OR NEW.asked_at IS NOT OLD.asked_at
  OR NEW.decided_by IS OLD.asked_by
BEGIN SELECT RAISE(ABORT, 'a request for evidence is decided once, by somebody else'); END;
--> statement-breakpoint
CREATE TRIGGER evidence_request_no_replace BEFORE INSERT ON evidence_request
WHEN EXISTS (SELECT 1 FROM evidence_request WHERE id = NEW.id)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: evidence_request'); END;
