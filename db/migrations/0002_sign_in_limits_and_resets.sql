CREATE TABLE `password_reset` (
	`token_hash` text PRIMARY KEY NOT NULL,
	`person_id` text NOT NULL,
	`created_at` integer NOT NULL,
	`expires_at` integer NOT NULL,
	`used_at` integer,
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `password_reset_by_person` ON `password_reset` (`person_id`);--> statement-breakpoint
CREATE TABLE `sign_in_try` (
	`key` text PRIMARY KEY NOT NULL,
	`wrong` integer NOT NULL,
	`last_at` integer NOT NULL,
	`wait_until` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `sign_in_try_by_time` ON `sign_in_try` (`last_at`);--> statement-breakpoint
CREATE TABLE `used_code` (
	`key` text PRIMARY KEY NOT NULL,
	`expires_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `used_code_by_end` ON `used_code` (`expires_at`);--> statement-breakpoint
ALTER TABLE `user` ADD `last_signed_in_at` integer;