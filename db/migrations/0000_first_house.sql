CREATE TABLE `credential` (
	`id` text PRIMARY KEY NOT NULL,
	`label` text NOT NULL,
	`family_id` text NOT NULL,
	`device_id` text NOT NULL,
	`kid` text NOT NULL,
	`bound_thumbprint` text,
	`state` text NOT NULL,
	`issued_at` integer NOT NULL,
	`expires_at` integer NOT NULL,
	`first_used_at` integer,
	`last_used_at` integer,
	`overlap_ends_at` integer,
	`successor_id` text,
	`predecessor_id` text,
	`renewal_asked_at` integer,
	`revoked_at` integer,
	`end_reason` text,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`kid`) REFERENCES `signing_key`(`kid`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `credential_by_end` ON `credential` (`state`,`expires_at`);--> statement-breakpoint
CREATE INDEX `credential_by_device` ON `credential` (`device_id`,`issued_at`);--> statement-breakpoint
CREATE UNIQUE INDEX `credential_one_successor` ON `credential` (`predecessor_id`) WHERE predecessor_id is not null;--> statement-breakpoint
CREATE TABLE `proof_seen` (
	`key` text PRIMARY KEY NOT NULL,
	`expires_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `proof_seen_by_end` ON `proof_seen` (`expires_at`);--> statement-breakpoint
CREATE TABLE `signing_key` (
	`kid` text PRIMARY KEY NOT NULL,
	`algorithm` text NOT NULL,
	`use` text NOT NULL,
	`public_jwk` text NOT NULL,
	`sealed_private_jwk` text NOT NULL,
	`created_at` integer NOT NULL,
	`superseded_at` integer,
	`retired_at` integer,
	`compromised_at` integer
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `signing_key_current` ON `signing_key` (`use`) WHERE superseded_at is null and retired_at is null;--> statement-breakpoint
CREATE TABLE `custody_entry` (
	`sequence` integer PRIMARY KEY NOT NULL,
	`at` integer NOT NULL,
	`kind` text NOT NULL,
	`actor_kind` text NOT NULL,
	`actor_id` text NOT NULL,
	`canonical` text NOT NULL,
	`leaf_hash` blob NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `custody_entry_by_time` ON `custody_entry` (`at`);--> statement-breakpoint
CREATE INDEX `custody_entry_by_kind` ON `custody_entry` (`kind`,`sequence`);--> statement-breakpoint
CREATE INDEX `custody_entry_by_actor` ON `custody_entry` (`actor_kind`,`actor_id`,`sequence`);--> statement-breakpoint
CREATE TABLE `custody_subject` (
	`subject_kind` text NOT NULL,
	`subject_id` text NOT NULL,
	`sequence` integer NOT NULL,
	PRIMARY KEY(`subject_kind`, `subject_id`, `sequence`),
	FOREIGN KEY (`sequence`) REFERENCES `custody_entry`(`sequence`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `device` (
	`id` text PRIMARY KEY NOT NULL,
	`asset_tag` text NOT NULL,
	`serial_number` text NOT NULL,
	`udi` text,
	`lot` text,
	`model_id` text NOT NULL,
	`ward_id` text,
	`firmware` text,
	`state` text NOT NULL,
	`state_reason` text,
	`key_thumbprint` text,
	`public_jwk` text,
	`enrolled_at` integer,
	`last_heard_at` integer,
	`battery_percent` integer,
	`clock_offset_ms` integer,
	`last_check_at` integer,
	`check_due_at` integer,
	`created_at` integer NOT NULL,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`model_id`) REFERENCES `device_model`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`ward_id`) REFERENCES `ward`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `device_asset_tag_unique` ON `device` (`asset_tag`);--> statement-breakpoint
CREATE UNIQUE INDEX `device_by_serial` ON `device` (`model_id`,`serial_number`);--> statement-breakpoint
CREATE INDEX `device_by_ward` ON `device` (`ward_id`);--> statement-breakpoint
CREATE INDEX `device_by_state` ON `device` (`state`,`asset_tag`);--> statement-breakpoint
CREATE INDEX `device_by_heard` ON `device` (`last_heard_at`);--> statement-breakpoint
CREATE TABLE `device_model` (
	`id` text PRIMARY KEY NOT NULL,
	`maker` text NOT NULL,
	`name` text NOT NULL,
	`sample_rates_hz` text NOT NULL,
	`bit_depths` text NOT NULL,
	`media_types` text NOT NULL,
	`allow_lossy` integer DEFAULT false NOT NULL,
	`longest_clip_seconds` real NOT NULL,
	`full_scale_note` text,
	`check_interval_days` integer NOT NULL,
	`signs_requests` integer DEFAULT true NOT NULL,
	`created_at` integer NOT NULL,
	`version` integer DEFAULT 1 NOT NULL
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `device_model_name_unique` ON `device_model` (`name`);--> statement-breakpoint
CREATE TABLE `enrolment_code` (
	`id` text PRIMARY KEY NOT NULL,
	`device_id` text NOT NULL,
	`code_hash` text NOT NULL,
	`created_by` text NOT NULL,
	`created_at` integer NOT NULL,
	`expires_at` integer NOT NULL,
	`tries_left` integer NOT NULL,
	`used_at` integer,
	`withdrawn_at` integer,
	`credential_id` text,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `enrolment_code_by_device` ON `enrolment_code` (`device_id`);--> statement-breakpoint
CREATE UNIQUE INDEX `enrolment_code_open` ON `enrolment_code` (`device_id`) WHERE used_at is null and withdrawn_at is null;--> statement-breakpoint
CREATE TABLE `firmware_change` (
	`id` text PRIMARY KEY NOT NULL,
	`device_id` text NOT NULL,
	`from_version` text,
	`to_version` text NOT NULL,
	`at` integer NOT NULL,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `firmware_change_by_device` ON `firmware_change` (`device_id`,`at`);--> statement-breakpoint
CREATE TABLE `account` (
	`id` text PRIMARY KEY NOT NULL,
	`account_id` text NOT NULL,
	`provider_id` text NOT NULL,
	`user_id` text NOT NULL,
	`access_token` text,
	`refresh_token` text,
	`id_token` text,
	`access_token_expires_at` integer,
	`refresh_token_expires_at` integer,
	`scope` text,
	`password` text,
	`created_at` integer NOT NULL,
	`updated_at` integer NOT NULL,
	FOREIGN KEY (`user_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE cascade
) STRICT;
--> statement-breakpoint
CREATE INDEX `account_by_user` ON `account` (`user_id`);--> statement-breakpoint
CREATE TABLE `invitation` (
	`id` text PRIMARY KEY NOT NULL,
	`email` text NOT NULL,
	`name` text NOT NULL,
	`roles` text NOT NULL,
	`ward_ids` text DEFAULT '' NOT NULL,
	`job_title` text,
	`token_hash` text NOT NULL,
	`invited_by` text NOT NULL,
	`created_at` integer NOT NULL,
	`expires_at` integer NOT NULL,
	`accepted_at` integer,
	`withdrawn_at` integer,
	FOREIGN KEY (`invited_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `invitation_by_token` ON `invitation` (`token_hash`);--> statement-breakpoint
CREATE INDEX `invitation_by_email` ON `invitation` (`email`);--> statement-breakpoint
CREATE TABLE `person_role` (
	`person_id` text NOT NULL,
	`role` text NOT NULL,
	`given_by` text,
	`given_at` integer NOT NULL,
	PRIMARY KEY(`person_id`, `role`),
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `rate_limit` (
	`id` text PRIMARY KEY NOT NULL,
	`key` text NOT NULL,
	`count` integer NOT NULL,
	`last_request` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `rate_limit_key_unique` ON `rate_limit` (`key`);--> statement-breakpoint
CREATE TABLE `session` (
	`id` text PRIMARY KEY NOT NULL,
	`expires_at` integer NOT NULL,
	`token` text NOT NULL,
	`created_at` integer NOT NULL,
	`updated_at` integer NOT NULL,
	`ip_address` text,
	`user_agent` text,
	`user_id` text NOT NULL,
	FOREIGN KEY (`user_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE cascade
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `session_token_unique` ON `session` (`token`);--> statement-breakpoint
CREATE INDEX `session_by_user` ON `session` (`user_id`);--> statement-breakpoint
CREATE TABLE `two_factor` (
	`id` text PRIMARY KEY NOT NULL,
	`secret` text NOT NULL,
	`backup_codes` text NOT NULL,
	`user_id` text NOT NULL,
	`verified` integer DEFAULT true,
	`failed_verification_count` integer DEFAULT 0,
	`locked_until` integer,
	FOREIGN KEY (`user_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE cascade
) STRICT;
--> statement-breakpoint
CREATE INDEX `two_factor_by_user` ON `two_factor` (`user_id`);--> statement-breakpoint
CREATE TABLE `user` (
	`id` text PRIMARY KEY NOT NULL,
	`name` text NOT NULL,
	`email` text NOT NULL,
	`email_verified` integer DEFAULT false NOT NULL,
	`image` text,
	`created_at` integer NOT NULL,
	`updated_at` integer NOT NULL,
	`two_factor_enabled` integer DEFAULT false,
	`job_title` text,
	`left_at` integer
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `user_email_unique` ON `user` (`email`);--> statement-breakpoint
CREATE TABLE `verification` (
	`id` text PRIMARY KEY NOT NULL,
	`identifier` text NOT NULL,
	`value` text NOT NULL,
	`expires_at` integer NOT NULL,
	`created_at` integer NOT NULL,
	`updated_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `verification_by_identifier` ON `verification` (`identifier`);--> statement-breakpoint
CREATE TABLE `access_reason` (
	`id` text PRIMARY KEY NOT NULL,
	`person_id` text NOT NULL,
	`patient_id` text NOT NULL,
	`reason` text NOT NULL,
	`given_at` integer NOT NULL,
	`expires_at` integer NOT NULL,
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`patient_id`) REFERENCES `patient`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `access_reason_by_person` ON `access_reason` (`person_id`,`patient_id`,`expires_at`);--> statement-breakpoint
CREATE TABLE `encounter` (
	`id` text PRIMARY KEY NOT NULL,
	`number` text NOT NULL,
	`patient_id` text NOT NULL,
	`ward_id` text,
	`bed` text,
	`status` text NOT NULL,
	`class` text,
	`started_at` integer NOT NULL,
	`ended_at` integer,
	`fhir_id` text,
	`updated_at` integer NOT NULL,
	FOREIGN KEY (`patient_id`) REFERENCES `patient`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`ward_id`) REFERENCES `ward`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `encounter_number_unique` ON `encounter` (`number`);--> statement-breakpoint
CREATE INDEX `encounter_by_ward` ON `encounter` (`ward_id`,`status`,`started_at`);--> statement-breakpoint
CREATE INDEX `encounter_by_patient` ON `encounter` (`patient_id`);--> statement-breakpoint
CREATE TABLE `patient` (
	`id` text PRIMARY KEY NOT NULL,
	`record_number` text NOT NULL,
	`family_name` text NOT NULL,
	`given_name` text NOT NULL,
	`birth_date` text,
	`sex` text,
	`fhir_id` text,
	`updated_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `patient_record_number_unique` ON `patient` (`record_number`);--> statement-breakpoint
CREATE TABLE `idempotency_key` (
	`key` text PRIMARY KEY NOT NULL,
	`request_hash` text NOT NULL,
	`status` integer NOT NULL,
	`body` text NOT NULL,
	`created_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE INDEX `idempotency_key_by_time` ON `idempotency_key` (`created_at`);--> statement-breakpoint
CREATE TABLE `outbox` (
	`id` text PRIMARY KEY NOT NULL,
	`kind` text NOT NULL,
	`payload` text NOT NULL,
	`created_at` integer NOT NULL,
	`due_at` integer NOT NULL,
	`leased_until` integer,
	`tries` integer DEFAULT 0 NOT NULL,
	`last_error` text,
	`done_at` integer,
	`dead_at` integer
) STRICT;
--> statement-breakpoint
CREATE INDEX `outbox_due` ON `outbox` (`done_at`,`dead_at`,`due_at`);--> statement-breakpoint
CREATE TABLE `policy` (
	`version` integer PRIMARY KEY NOT NULL,
	`limits` text NOT NULL,
	`made_by` text,
	`made_at` integer NOT NULL,
	`note` text
) STRICT;
--> statement-breakpoint
CREATE TABLE `derived_object` (
	`recording_id` text NOT NULL,
	`kind` text NOT NULL,
	`key` text NOT NULL,
	`sha256` text NOT NULL,
	`input_sha256` text NOT NULL,
	`bytes` integer NOT NULL,
	`made_at` integer NOT NULL,
	PRIMARY KEY(`recording_id`, `kind`),
	FOREIGN KEY (`recording_id`) REFERENCES `recording`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE TABLE `filing` (
	`id` text PRIMARY KEY NOT NULL,
	`recording_id` text NOT NULL,
	`encounter_id` text NOT NULL,
	`patient_id` text NOT NULL,
	`by` text NOT NULL,
	`session_id` text,
	`person_id` text,
	`reason` text,
	`filed_at` integer NOT NULL,
	`superseded_at` integer,
	`superseded_by` text,
	FOREIGN KEY (`recording_id`) REFERENCES `recording`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`encounter_id`) REFERENCES `encounter`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`patient_id`) REFERENCES `patient`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`session_id`) REFERENCES `listening_session`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `filing_current` ON `filing` (`recording_id`) WHERE superseded_at is null;--> statement-breakpoint
CREATE INDEX `filing_by_encounter` ON `filing` (`encounter_id`,`filed_at`);--> statement-breakpoint
CREATE INDEX `filing_by_patient` ON `filing` (`patient_id`,`filed_at`);--> statement-breakpoint
CREATE TABLE `listening_session` (
	`id` text PRIMARY KEY NOT NULL,
	`number` text NOT NULL,
	`device_id` text NOT NULL,
	`encounter_id` text NOT NULL,
	`opened_by` text NOT NULL,
	`opened_at` integer NOT NULL,
	`closed_at` integer,
	`closed_by` text,
	`closed_why` text,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`encounter_id`) REFERENCES `encounter`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`opened_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `listening_session_number_unique` ON `listening_session` (`number`);--> statement-breakpoint
CREATE UNIQUE INDEX `listening_session_open` ON `listening_session` (`device_id`) WHERE closed_at is null;--> statement-breakpoint
CREATE INDEX `listening_session_by_encounter` ON `listening_session` (`encounter_id`,`opened_at`);--> statement-breakpoint
CREATE INDEX `listening_session_by_device` ON `listening_session` (`device_id`,`opened_at`);--> statement-breakpoint
CREATE TABLE `recording` (
	`id` text PRIMARY KEY NOT NULL,
	`number` text NOT NULL,
	`device_id` text NOT NULL,
	`model_id` text NOT NULL,
	`credential_id` text,
	`device_recording_number` text NOT NULL,
	`stage` text NOT NULL,
	`stopped` text,
	`declared_sha256` text NOT NULL,
	`declared_bytes` integer NOT NULL,
	`media_type` text NOT NULL,
	`recorded_at_device` integer NOT NULL,
	`recorded_at` integer NOT NULL,
	`clock_offset_ms` integer NOT NULL,
	`site` text,
	`chestpiece_side` text,
	`gain_step` integer,
	`filter` text,
	`firmware` text,
	`scanned_identifier` text,
	`request_hash` text NOT NULL,
	`slot_key` text NOT NULL,
	`slot_expires_at` integer NOT NULL,
	`awaited_at` integer NOT NULL,
	`received_at` integer,
	`sealed_at` integer,
	`measured_at` integer,
	`filed_at` integer,
	`original_key` text,
	`locked_until` integer,
	`lock_kind` text,
	`verdict` text,
	`policy_version` integer,
	`findings` text,
	`measures` text,
	`facts` text,
	`metadata` text,
	`duration_seconds` real,
	`sample_rate_hz` real,
	`noise_floor_dbfs` real,
	`active_level_dbfs` real,
	`dc_fraction` real,
	`kept_reason` text,
	`kept_by` text,
	`kept_at` integer,
	`version` integer DEFAULT 1 NOT NULL,
	FOREIGN KEY (`device_id`) REFERENCES `device`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`model_id`) REFERENCES `device_model`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`kept_by`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `recording_number_unique` ON `recording` (`number`);--> statement-breakpoint
CREATE UNIQUE INDEX `recording_by_device_number` ON `recording` (`device_id`,`device_recording_number`);--> statement-breakpoint
CREATE INDEX `recording_by_device` ON `recording` (`device_id`,`awaited_at`);--> statement-breakpoint
CREATE INDEX `recording_by_time` ON `recording` (`awaited_at`,`id`);--> statement-breakpoint
CREATE INDEX `recording_unfinished` ON `recording` (`stage`,`awaited_at`) WHERE stopped is null and stage in ('awaited','received','sealed');--> statement-breakpoint
CREATE INDEX `recording_in_tray` ON `recording` (`measured_at`) WHERE stage = 'measured' and stopped is null;--> statement-breakpoint
CREATE TABLE `person_ward` (
	`person_id` text NOT NULL,
	`ward_id` text NOT NULL,
	PRIMARY KEY(`person_id`, `ward_id`),
	FOREIGN KEY (`person_id`) REFERENCES `user`(`id`) ON UPDATE no action ON DELETE no action,
	FOREIGN KEY (`ward_id`) REFERENCES `ward`(`id`) ON UPDATE no action ON DELETE no action
) STRICT;
--> statement-breakpoint
CREATE INDEX `person_ward_by_ward` ON `person_ward` (`ward_id`);--> statement-breakpoint
CREATE TABLE `ward` (
	`id` text PRIMARY KEY NOT NULL,
	`name` text NOT NULL,
	`created_at` integer NOT NULL
) STRICT;
--> statement-breakpoint
CREATE UNIQUE INDEX `ward_name_unique` ON `ward` (`name`);