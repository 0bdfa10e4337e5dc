CREATE TABLE `connection_check` (
	`kind` text PRIMARY KEY NOT NULL,
	`ok` integer NOT NULL,
	`steps` text NOT NULL,
	`checked_by` text NOT NULL,
	`checked_at` integer NOT NULL,
	FOREIGN KEY (`checked_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `connection_setting` (
	`kind` text PRIMARY KEY NOT NULL,
	`settings` text NOT NULL,
	`sealed_secret` text,
	`changed_by` text NOT NULL,
	`changed_at` integer NOT NULL,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`changed_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `passkey` (
	`id` text PRIMARY KEY NOT NULL,
	`person_id` text NOT NULL,
	`name` text NOT NULL,
	`public_key` blob NOT NULL,
	`counter` integer NOT NULL,
	`transports` text NOT NULL,
	`backed_up` integer NOT NULL,
	`created_at` integer NOT NULL,
	`last_used_at` integer,
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `passkey_by_person` ON `passkey` (`person_id`);--> statement-breakpoint
CREATE TABLE `sign_in_attempt` (
	`key_hash` text PRIMARY KEY NOT NULL,
	`purpose` text NOT NULL,
	`person_id` text,
	`sealed_state` text NOT NULL,
	`expires_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `sign_in_attempt_by_end` ON `sign_in_attempt` (`expires_at`);--> statement-breakpoint
CREATE TABLE `api_client` (
	`id` text PRIMARY KEY NOT NULL,
	`name` text NOT NULL,
	`scopes` text NOT NULL,
	`method` text NOT NULL,
	`secret_hash` text,
	`previous_secret_hash` text,
	`previous_ends_at` integer,
	`public_keys` text,
	`created_by` text NOT NULL,
	`created_at` integer NOT NULL,
	`last_used_at` integer,
	`revoked_at` integer,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`created_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `api_client_by_time` ON `api_client` (`created_at`,`id`);--> statement-breakpoint
CREATE TABLE `webhook` (
	`id` text PRIMARY KEY NOT NULL,
	`name` text NOT NULL,
	`url` text NOT NULL,
	`events` text NOT NULL,
	`sealed_secret` text NOT NULL,
	`sealed_previous_secret` text,
	`previous_ends_at` integer,
	`paused_at` integer,
	`removed_at` integer,
	`created_by` text NOT NULL,
	`created_at` integer NOT NULL,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`created_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `webhook_by_time` ON `webhook` (`created_at`,`id`);--> statement-breakpoint
CREATE TABLE `webhook_cursor` (
	`id` text PRIMARY KEY NOT NULL,
	`sequence` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE TABLE `webhook_delivery` (
	`id` text PRIMARY KEY NOT NULL,
	`webhook_id` text NOT NULL,
	`event_id` text NOT NULL,
	`type` text NOT NULL,
	`body` text NOT NULL,
	`created_at` integer NOT NULL,
	`tried_at` integer,
	`status` integer,
	`failure` text,
	FOREIGN KEY (`webhook_id`) REFERENCES `webhook`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `webhook_delivery_once` ON `webhook_delivery` (`webhook_id`,`event_id`);--> statement-breakpoint
CREATE INDEX `webhook_delivery_by_time` ON `webhook_delivery` (`webhook_id`,`created_at`,`id`);--> statement-breakpoint
CREATE TABLE `policy_version` (
	`kind` text NOT NULL,
	`version` integer NOT NULL,
	`settings` text NOT NULL,
	`reason` text NOT NULL,
	`made_by` text NOT NULL,
	`made_at` integer NOT NULL,
	PRIMARY KEY(`kind`, `version`)
) STRICT;
--> statement-breakpoint
ALTER TABLE `credential` ADD `renew_after` integer;--> statement-breakpoint
-- What was decided stays readable: a change is a new version.
CREATE TRIGGER policy_version_no_update BEFORE UPDATE ON policy_version
BEGIN SELECT RAISE(ABORT, 'policies are changed by a new version'); END;
--> statement-breakpoint
CREATE TRIGGER policy_version_no_delete BEFORE DELETE ON policy_version
BEGIN SELECT RAISE(ABORT, 'policies are changed by a new version'); END;
--> statement-breakpoint
CREATE TRIGGER policy_version_dense BEFORE INSERT ON policy_version
WHEN NEW.version IS NOT (SELECT coalesce(max(version), 0) + 1 FROM policy_version WHERE kind = NEW.kind)
BEGIN SELECT RAISE(ABORT, 'UNIQUE constraint failed: policy_version.kind, policy_version.version'); END;
