CREATE TABLE "calendar_feeds" (
	"lab_id" uuid NOT NULL,
	"user_id" uuid NOT NULL,
	"token_hash" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "calendar_feeds_lab_id_user_id_pk" PRIMARY KEY("lab_id","user_id")
);
--> statement-breakpoint
CREATE TABLE "room_hours" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"hours" json NOT NULL,
	"changed_at" timestamp (6) with time zone NOT NULL,
	"changed_by" text NOT NULL,
	CONSTRAINT "room_hours_lab_id_rig_id_pk" PRIMARY KEY("lab_id","rig_id")
);
--> statement-breakpoint
CREATE TABLE "schedule_starts" (
	"lab_id" uuid NOT NULL,
	"schedule_id" uuid NOT NULL,
	"due_at" timestamp (6) with time zone NOT NULL,
	"outcome" text,
	"why" text DEFAULT '' NOT NULL,
	"run_id" uuid,
	"announced_at" timestamp (6) with time zone,
	"decided_at" timestamp (6) with time zone,
	CONSTRAINT "schedule_starts_lab_id_schedule_id_due_at_pk" PRIMARY KEY("lab_id","schedule_id","due_at")
);
--> statement-breakpoint
CREATE TABLE "schedules" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"protocol_id" uuid NOT NULL,
	"protocol_revision" integer NOT NULL,
	"mass_set_id" uuid NOT NULL,
	"plan" json NOT NULL,
	"notes" text DEFAULT '' NOT NULL,
	"state" text DEFAULT 'active' NOT NULL,
	"decided_until_at" timestamp (6) with time zone NOT NULL,
	"made_by_id" uuid NOT NULL,
	"made_by" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "schedules_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "calendar_feeds" ADD CONSTRAINT "calendar_feeds_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "calendar_feeds" ADD CONSTRAINT "calendar_feeds_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "room_hours" ADD CONSTRAINT "room_hours_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "schedule_starts" ADD CONSTRAINT "schedule_starts_schedule_fk" FOREIGN KEY ("lab_id","schedule_id") REFERENCES "public"."schedules"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "schedules" ADD CONSTRAINT "schedules_made_by_id_users_id_fk" FOREIGN KEY ("made_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "schedules" ADD CONSTRAINT "schedules_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "schedules" ADD CONSTRAINT "schedules_lab_id_mass_set_id_mass_sets_lab_id_id_fk" FOREIGN KEY ("lab_id","mass_set_id") REFERENCES "public"."mass_sets"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "schedules" ADD CONSTRAINT "schedules_revision_fk" FOREIGN KEY ("lab_id","protocol_id","protocol_revision") REFERENCES "public"."protocol_revisions"("lab_id","protocol_id","number") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE UNIQUE INDEX "calendar_feeds_token" ON "calendar_feeds" USING btree ("token_hash");--> statement-breakpoint
CREATE INDEX "schedules_standing" ON "schedules" USING btree ("lab_id","rig_id") WHERE "schedules"."state" <> 'ended';