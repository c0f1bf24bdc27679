CREATE TABLE "audit" (
	"lab_id" uuid NOT NULL,
	"seq" bigint NOT NULL,
	"at" text NOT NULL,
	"kind" text NOT NULL,
	"data" json NOT NULL,
	"prev" text NOT NULL,
	"hash" text NOT NULL,
	CONSTRAINT "audit_lab_id_seq_pk" PRIMARY KEY("lab_id","seq")
);
--> statement-breakpoint
CREATE TABLE "labs" (
	"id" uuid PRIMARY KEY DEFAULT gen_random_uuid() NOT NULL,
	"name" text NOT NULL,
	"time_zone" text NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL
);
--> statement-breakpoint
CREATE TABLE "invitations" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"token_hash" text NOT NULL,
	"email" text NOT NULL,
	"role" text NOT NULL,
	"invited_by_id" uuid NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	"expires_at" timestamp (6) with time zone NOT NULL,
	"accepted_at" timestamp (6) with time zone,
	"withdrawn_at" timestamp (6) with time zone,
	CONSTRAINT "invitations_lab_id_id_pk" PRIMARY KEY("lab_id","id"),
	CONSTRAINT "invitations_role" CHECK ("invitations"."role" in ('owner', 'keeper', 'operator', 'analyst', 'viewer'))
);
--> statement-breakpoint
CREATE TABLE "memberships" (
	"lab_id" uuid NOT NULL,
	"user_id" uuid NOT NULL,
	"role" text NOT NULL,
	"since" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "memberships_lab_id_user_id_pk" PRIMARY KEY("lab_id","user_id"),
	CONSTRAINT "memberships_role" CHECK ("memberships"."role" in ('owner', 'keeper', 'operator', 'analyst', 'viewer'))
);
--> statement-breakpoint
CREATE TABLE "password_resets" (
	"token_hash" text PRIMARY KEY NOT NULL,
	"user_id" uuid NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	"expires_at" timestamp (6) with time zone NOT NULL,
	"used_at" timestamp (6) with time zone
);
--> statement-breakpoint
CREATE TABLE "sessions" (
	"id" text PRIMARY KEY NOT NULL,
	"user_id" uuid NOT NULL,
	"expires_at" timestamp with time zone NOT NULL,
	"ends_at" timestamp (6) with time zone NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	"auth_at" timestamp (6) with time zone NOT NULL,
	"user_agent" text NOT NULL,
	"ip" text NOT NULL
);
--> statement-breakpoint
CREATE TABLE "users" (
	"id" uuid PRIMARY KEY DEFAULT gen_random_uuid() NOT NULL,
	"name" text NOT NULL,
	"email" text NOT NULL,
	"password_hash" text NOT NULL,
	"demo" boolean DEFAULT false NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "users_email_lower" CHECK ("users"."email" = lower("users"."email"))
);
--> statement-breakpoint
CREATE TABLE "arms" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"name" text NOT NULL,
	"note" text DEFAULT '' NOT NULL,
	"from_at" timestamp (6) with time zone NOT NULL,
	"until_at" timestamp (6) with time zone NOT NULL,
	"armed_by_id" uuid NOT NULL,
	"ended_at" timestamp (6) with time zone,
	"ended_why" text,
	CONSTRAINT "arms_lab_id_id_pk" PRIMARY KEY("lab_id","id"),
	CONSTRAINT "arms_length" CHECK ("arms"."until_at" > "arms"."from_at" and "arms"."until_at" <= "arms"."from_at" + interval '72 hours')
);
--> statement-breakpoint
CREATE TABLE "mass_sets" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"label" text NOT NULL,
	"sources" json NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "mass_sets_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "rig_leases" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"holder" text NOT NULL,
	"epoch" bigint NOT NULL,
	"until_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "rig_leases_lab_id_rig_id_pk" PRIMARY KEY("lab_id","rig_id")
);
--> statement-breakpoint
CREATE TABLE "rig_links" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"settings" json NOT NULL,
	"changed_at" timestamp (6) with time zone NOT NULL,
	"changed_by" text NOT NULL,
	CONSTRAINT "rig_links_lab_id_rig_id_pk" PRIMARY KEY("lab_id","rig_id")
);
--> statement-breakpoint
CREATE TABLE "rig_revisions" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"number" integer NOT NULL,
	"name" text NOT NULL,
	"document" json NOT NULL,
	"reason" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by_id" uuid NOT NULL,
	"made_by" text NOT NULL,
	CONSTRAINT "rig_revisions_lab_id_rig_id_number_pk" PRIMARY KEY("lab_id","rig_id","number")
);
--> statement-breakpoint
CREATE TABLE "rigs" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"name" text NOT NULL,
	"revision" integer NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "rigs_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "protocol_revisions" (
	"lab_id" uuid NOT NULL,
	"protocol_id" uuid NOT NULL,
	"number" integer NOT NULL,
	"document" json NOT NULL,
	"sha256" text NOT NULL,
	"note" text DEFAULT '' NOT NULL,
	"draft_version" integer NOT NULL,
	"rig_id" uuid NOT NULL,
	"rig_revision" integer NOT NULL,
	"issued_at" timestamp (6) with time zone NOT NULL,
	"issued_by_id" uuid NOT NULL,
	"issued_by" text NOT NULL,
	CONSTRAINT "protocol_revisions_lab_id_protocol_id_number_pk" PRIMARY KEY("lab_id","protocol_id","number")
);
--> statement-breakpoint
CREATE TABLE "protocols" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"name" text NOT NULL,
	"document" json NOT NULL,
	"version" integer DEFAULT 1 NOT NULL,
	"updated_at" timestamp (6) with time zone NOT NULL,
	"updated_by_id" uuid NOT NULL,
	"updated_by" text NOT NULL,
	CONSTRAINT "protocols_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "run_events" (
	"lab_id" uuid NOT NULL,
	"run_id" uuid NOT NULL,
	"seq" integer NOT NULL,
	"at" text NOT NULL,
	"kind" text NOT NULL,
	"data" json NOT NULL,
	"prev" text NOT NULL,
	"hash" text NOT NULL,
	CONSTRAINT "run_events_lab_id_run_id_seq_pk" PRIMARY KEY("lab_id","run_id","seq")
);
--> statement-breakpoint
CREATE TABLE "run_steps" (
	"lab_id" uuid NOT NULL,
	"run_id" uuid NOT NULL,
	"seq" integer NOT NULL,
	"path" text NOT NULL,
	"kind" text NOT NULL,
	"label" text NOT NULL,
	"station" text NOT NULL,
	"planned_start" timestamp (6) with time zone NOT NULL,
	"planned_end" timestamp (6) with time zone,
	"started_at" timestamp (6) with time zone NOT NULL,
	"ended_at" timestamp (6) with time zone,
	"u_start_s" double precision NOT NULL,
	"u_end_s" double precision,
	"angle_start_deg" double precision,
	"angle_end_deg" double precision,
	"outcome" text,
	"angle_source" text NOT NULL,
	"u_angle_deg" double precision,
	"good" boolean,
	CONSTRAINT "run_steps_lab_id_run_id_seq_pk" PRIMARY KEY("lab_id","run_id","seq")
);
--> statement-breakpoint
CREATE TABLE "runs" (
	"lab_id" uuid NOT NULL,
	"id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"rig_revision" integer NOT NULL,
	"protocol_id" uuid,
	"mass_set_id" uuid,
	"rehearsal" boolean NOT NULL,
	"rig_name" text NOT NULL,
	"protocol_name" text NOT NULL,
	"protocol_revision" integer NOT NULL,
	"mass_set_label" text NOT NULL,
	"operator" text NOT NULL,
	"start" json NOT NULL,
	"snapshot" json,
	"chart_version" integer DEFAULT 0 NOT NULL,
	"last_seq" integer DEFAULT 0 NOT NULL,
	"last_hash" text DEFAULT '0000000000000000000000000000000000000000000000000000000000000000' NOT NULL,
	"state" text NOT NULL,
	"outcome" text,
	"failure" text,
	"created_at" timestamp (6) with time zone NOT NULL,
	"started_at" timestamp (6) with time zone,
	"ended_at" timestamp (6) with time zone,
	"predicted_end_at" timestamp (6) with time zone,
	CONSTRAINT "runs_lab_id_id_pk" PRIMARY KEY("lab_id","id"),
	CONSTRAINT "runs_id_given" CHECK ("runs"."id" <> '00000000-0000-0000-0000-000000000000')
);
--> statement-breakpoint
CREATE TABLE "channels" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"run_id" uuid,
	"name" text NOT NULL,
	"quantity" text NOT NULL,
	"unit" text NOT NULL,
	"role" text NOT NULL,
	"source" text NOT NULL,
	"created_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "channels_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "evaluations" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"run_id" uuid NOT NULL,
	"state" text NOT NULL,
	"channel" text,
	"created_at" timestamp (6) with time zone NOT NULL,
	"created_by" text NOT NULL,
	"finished_at" timestamp (6) with time zone,
	"error" text,
	"result" json,
	"curves" json,
	CONSTRAINT "evaluations_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "import_pieces" (
	"lab_id" uuid NOT NULL,
	"import_id" uuid NOT NULL,
	"number" integer NOT NULL,
	"bytes" "bytea" NOT NULL,
	CONSTRAINT "import_pieces_lab_id_import_id_number_pk" PRIMARY KEY("lab_id","import_id","number")
);
--> statement-breakpoint
CREATE TABLE "imports" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"run_id" uuid NOT NULL,
	"file_name" text NOT NULL,
	"state" text NOT NULL,
	"bytes" bigint DEFAULT 0 NOT NULL,
	"sha256" text,
	"preview" json,
	"mapping" json,
	"channel_id" uuid,
	"created_at" timestamp (6) with time zone NOT NULL,
	"created_by" text NOT NULL,
	"stored_at" timestamp (6) with time zone,
	CONSTRAINT "imports_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "samples" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"value" double precision NOT NULL,
	CONSTRAINT "samples_lab_id_channel_id_at_pk" PRIMARY KEY("lab_id","channel_id","at")
);
--> statement-breakpoint
CREATE TABLE "idempotency_keys" (
	"user_id" uuid NOT NULL,
	"key" text NOT NULL,
	"fingerprint" text NOT NULL,
	"status" integer,
	"body" json,
	"etag" text,
	"claimed_at" timestamp (6) with time zone NOT NULL,
	"expires_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "idempotency_keys_user_id_key_pk" PRIMARY KEY("user_id","key")
);
--> statement-breakpoint
CREATE TABLE "jobs" (
	"id" uuid PRIMARY KEY DEFAULT gen_random_uuid() NOT NULL,
	"lab_id" uuid,
	"kind" text NOT NULL,
	"payload" json NOT NULL,
	"state" text DEFAULT 'waiting' NOT NULL,
	"attempts" integer DEFAULT 0 NOT NULL,
	"max_attempts" integer NOT NULL,
	"due_at" timestamp (6) with time zone NOT NULL,
	"lease_until" timestamp (6) with time zone,
	"holder" text,
	"last_error" text,
	"created_at" timestamp (6) with time zone NOT NULL,
	"finished_at" timestamp (6) with time zone
);
--> statement-breakpoint
CREATE TABLE "rate_limits" (
	"bucket" text PRIMARY KEY NOT NULL,
	"window_start_at" timestamp (6) with time zone NOT NULL,
	"window_end_at" timestamp (6) with time zone NOT NULL,
	"count" integer NOT NULL
);
--> statement-breakpoint
ALTER TABLE "audit" ADD CONSTRAINT "audit_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "invitations" ADD CONSTRAINT "invitations_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "invitations" ADD CONSTRAINT "invitations_invited_by_id_users_id_fk" FOREIGN KEY ("invited_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "memberships" ADD CONSTRAINT "memberships_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "memberships" ADD CONSTRAINT "memberships_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "password_resets" ADD CONSTRAINT "password_resets_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "sessions" ADD CONSTRAINT "sessions_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "arms" ADD CONSTRAINT "arms_armed_by_id_users_id_fk" FOREIGN KEY ("armed_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "arms" ADD CONSTRAINT "arms_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "mass_sets" ADD CONSTRAINT "mass_sets_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "rig_leases" ADD CONSTRAINT "rig_leases_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "rig_links" ADD CONSTRAINT "rig_links_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "rig_revisions" ADD CONSTRAINT "rig_revisions_made_by_id_users_id_fk" FOREIGN KEY ("made_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "rig_revisions" ADD CONSTRAINT "rig_revisions_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "rigs" ADD CONSTRAINT "rigs_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "protocol_revisions" ADD CONSTRAINT "protocol_revisions_issued_by_id_users_id_fk" FOREIGN KEY ("issued_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "protocol_revisions" ADD CONSTRAINT "protocol_revisions_lab_id_protocol_id_protocols_lab_id_id_fk" FOREIGN KEY ("lab_id","protocol_id") REFERENCES "public"."protocols"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "protocol_revisions" ADD CONSTRAINT "protocol_revisions_rig_revision_fk" FOREIGN KEY ("lab_id","rig_id","rig_revision") REFERENCES "public"."rig_revisions"("lab_id","rig_id","number") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "protocols" ADD CONSTRAINT "protocols_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "protocols" ADD CONSTRAINT "protocols_updated_by_id_users_id_fk" FOREIGN KEY ("updated_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "run_events" ADD CONSTRAINT "run_events_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "run_steps" ADD CONSTRAINT "run_steps_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "runs" ADD CONSTRAINT "runs_rig_revision_fk" FOREIGN KEY ("lab_id","rig_id","rig_revision") REFERENCES "public"."rig_revisions"("lab_id","rig_id","number") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "runs" ADD CONSTRAINT "runs_protocol_fk" FOREIGN KEY ("lab_id","protocol_id") REFERENCES "public"."protocols"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "runs" ADD CONSTRAINT "runs_mass_set_fk" FOREIGN KEY ("lab_id","mass_set_id") REFERENCES "public"."mass_sets"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "channels" ADD CONSTRAINT "channels_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "channels" ADD CONSTRAINT "channels_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "evaluations" ADD CONSTRAINT "evaluations_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "evaluations" ADD CONSTRAINT "evaluations_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "import_pieces" ADD CONSTRAINT "import_pieces_lab_id_import_id_imports_lab_id_id_fk" FOREIGN KEY ("lab_id","import_id") REFERENCES "public"."imports"("lab_id","id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "imports" ADD CONSTRAINT "imports_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "imports" ADD CONSTRAINT "imports_lab_id_channel_id_channels_lab_id_id_fk" FOREIGN KEY ("lab_id","channel_id") REFERENCES "public"."channels"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "idempotency_keys" ADD CONSTRAINT "idempotency_keys_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "jobs" ADD CONSTRAINT "jobs_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE UNIQUE INDEX "invitations_token" ON "invitations" USING btree ("token_hash");--> statement-breakpoint
CREATE INDEX "memberships_user" ON "memberships" USING btree ("user_id");--> statement-breakpoint
CREATE INDEX "password_resets_user" ON "password_resets" USING btree ("user_id");--> statement-breakpoint
CREATE INDEX "sessions_user" ON "sessions" USING btree ("user_id");--> statement-breakpoint
CREATE INDEX "sessions_ends" ON "sessions" USING btree ("ends_at");--> statement-breakpoint
CREATE UNIQUE INDEX "users_email" ON "users" USING btree ("email");--> statement-breakpoint
CREATE UNIQUE INDEX "arms_one_per_rig" ON "arms" USING btree ("lab_id","rig_id") WHERE "arms"."ended_at" is null;--> statement-breakpoint
CREATE INDEX "arms_rig" ON "arms" USING btree ("lab_id","rig_id","from_at");--> statement-breakpoint
CREATE UNIQUE INDEX "mass_sets_label" ON "mass_sets" USING btree ("lab_id","rig_id","label");--> statement-breakpoint
CREATE UNIQUE INDEX "runs_one_per_rig" ON "runs" USING btree ("lab_id","rig_id") WHERE not "runs"."rehearsal" and "runs"."state" not in ('finished', 'stopped', 'failed');--> statement-breakpoint
CREATE INDEX "runs_newest" ON "runs" USING btree ("lab_id","created_at" DESC NULLS LAST);--> statement-breakpoint
CREATE UNIQUE INDEX "channels_name_of_rig" ON "channels" USING btree ("lab_id","rig_id","name") WHERE "channels"."run_id" is null;--> statement-breakpoint
CREATE UNIQUE INDEX "channels_name_of_run" ON "channels" USING btree ("lab_id","run_id","name") WHERE "channels"."run_id" is not null;--> statement-breakpoint
CREATE INDEX "evaluations_run" ON "evaluations" USING btree ("lab_id","run_id","created_at");--> statement-breakpoint
CREATE INDEX "imports_run" ON "imports" USING btree ("lab_id","run_id");--> statement-breakpoint
CREATE INDEX "idempotency_keys_expiry" ON "idempotency_keys" USING btree ("expires_at");--> statement-breakpoint
CREATE INDEX "jobs_open" ON "jobs" USING btree ("due_at") WHERE "jobs"."state" in ('waiting', 'running');--> statement-breakpoint
CREATE INDEX "rate_limits_end" ON "rate_limits" USING btree ("window_end_at");