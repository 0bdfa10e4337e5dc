CREATE TABLE `rotation_member` (
	`run_id` text NOT NULL,
	`credential_id` text NOT NULL,
	`device_id` text NOT NULL,
	`state` text NOT NULL,
	`asked_at` integer,
	`ended_at` integer,
	PRIMARY KEY(`run_id`, `credential_id`),
	FOREIGN KEY (`run_id`) REFERENCES `rotation_run`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`credential_id`) REFERENCES `credential`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `rotation_member_by_state` ON `rotation_member` (`run_id`,`state`,`credential_id`);--> statement-breakpoint
CREATE INDEX `rotation_member_by_credential` ON `rotation_member` (`credential_id`);--> statement-breakpoint
CREATE TABLE `rotation_run` (
	`id` text PRIMARY KEY NOT NULL,
	`label` text NOT NULL,
	`state` text NOT NULL,
	`reason` text NOT NULL,
	`selection` text NOT NULL,
	`wave_size` integer NOT NULL,
	`wave_pause_ms` integer NOT NULL,
	`next_wave_at` integer NOT NULL,
	`deadline_at` integer NOT NULL,
	`at_deadline` text NOT NULL,
	`started_by` text NOT NULL,
	`started_at` integer NOT NULL,
	`ended_at` integer,
	`version` integer DEFAULT 1 NOT NULL
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `rotation_run_label_unique` ON `rotation_run` (`label`);--> statement-breakpoint
CREATE INDEX `rotation_run_by_start` ON `rotation_run` (`started_at`);--> statement-breakpoint
CREATE INDEX `rotation_run_by_state` ON `rotation_run` (`state`);