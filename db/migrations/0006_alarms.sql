CREATE TABLE "alarm_history" (
	"lab_id" uuid NOT NULL,
	"seq" bigserial NOT NULL,
	"alarm_id" uuid NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"fact" text NOT NULL,
	"occurrence" integer NOT NULL,
	"by" text DEFAULT '' NOT NULL,
	"words" text DEFAULT '' NOT NULL,
	CONSTRAINT "alarm_history_lab_id_seq_pk" PRIMARY KEY("lab_id","seq")
);
--> statement-breakpoint
CREATE TABLE "alarm_hops" (
	"lab_id" uuid NOT NULL,
	"seq" bigserial NOT NULL,
	"alarm_id" uuid NOT NULL,
	"occurrence" integer NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"user_id" uuid,
	"name" text NOT NULL,
	"means" text NOT NULL,
	"outcome" text NOT NULL,
	"detail" text DEFAULT '' NOT NULL,
	CONSTRAINT "alarm_hops_lab_id_seq_pk" PRIMARY KEY("lab_id","seq")
);
--> statement-breakpoint
CREATE TABLE "alarms" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"code" text NOT NULL,
	"rig_id" uuid,
	"subject" text DEFAULT '' NOT NULL,
	"words" text DEFAULT '' NOT NULL,
	"rings" text NOT NULL,
	"on_delay_s" double precision,
	"state" text NOT NULL,
	"snapshot" json NOT NULL,
	"raised_at" timestamp (6) with time zone,
	"due_at" timestamp (6) with time zone,
	"cause_id" uuid,
	"run_id" uuid,
	"told_at" timestamp (6) with time zone,
	"changed_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "alarms_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "channel_limits" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"channel_id" uuid NOT NULL,
	"limit" json NOT NULL,
	"changed_at" timestamp (6) with time zone NOT NULL,
	"changed_by" text NOT NULL,
	CONSTRAINT "channel_limits_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "lab_calls" (
	"lab_id" uuid PRIMARY KEY NOT NULL,
	"settings" json NOT NULL,
	"sign_url" text,
	"sign_at" timestamp (6) with time zone,
	"sign_ok" boolean,
	"sign_detail" text DEFAULT '' NOT NULL,
	"sign_failing_since" timestamp (6) with time zone
);
--> statement-breakpoint
CREATE TABLE "own_calls" (
	"lab_id" uuid NOT NULL,
	"user_id" uuid NOT NULL,
	"own" json NOT NULL,
	CONSTRAINT "own_calls_lab_id_user_id_pk" PRIMARY KEY("lab_id","user_id")
);
--> statement-breakpoint
CREATE TABLE "push_subscriptions" (
	"user_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"endpoint" text NOT NULL,
	"p256dh" text NOT NULL,
	"auth" text NOT NULL,
	"device" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"last_sent_at" timestamp (6) with time zone,
	CONSTRAINT "push_subscriptions_user_id_id_pk" PRIMARY KEY("user_id","id")
);
--> statement-breakpoint
CREATE TABLE "server_secrets" (
	"name" text PRIMARY KEY NOT NULL,
	"value" json NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL
);
--> statement-breakpoint
ALTER TABLE "runs" ADD COLUMN "started_by_id" uuid;--> statement-breakpoint
ALTER TABLE "alarm_history" ADD CONSTRAINT "alarm_history_lab_id_alarm_id_alarms_lab_id_id_fk" FOREIGN KEY ("lab_id","alarm_id") REFERENCES "public"."alarms"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "alarm_hops" ADD CONSTRAINT "alarm_hops_lab_id_alarm_id_alarms_lab_id_id_fk" FOREIGN KEY ("lab_id","alarm_id") REFERENCES "public"."alarms"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "alarms" ADD CONSTRAINT "alarms_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "alarms" ADD CONSTRAINT "alarms_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "channel_limits" ADD CONSTRAINT "channel_limits_lab_id_channel_id_channels_lab_id_id_fk" FOREIGN KEY ("lab_id","channel_id") REFERENCES "public"."channels"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "lab_calls" ADD CONSTRAINT "lab_calls_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "own_calls" ADD CONSTRAINT "own_calls_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "own_calls" ADD CONSTRAINT "own_calls_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "push_subscriptions" ADD CONSTRAINT "push_subscriptions_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE cascade ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "alarm_history_alarm" ON "alarm_history" USING btree ("lab_id","alarm_id","seq");--> statement-breakpoint
CREATE INDEX "alarm_hops_alarm" ON "alarm_hops" USING btree ("lab_id","alarm_id","seq");--> statement-breakpoint
CREATE UNIQUE INDEX "alarms_place" ON "alarms" USING btree ("lab_id","code",coalesce("rig_id"::text, ''),"subject");--> statement-breakpoint
CREATE INDEX "alarms_due" ON "alarms" USING btree ("due_at") WHERE "alarms"."due_at" is not null;--> statement-breakpoint
CREATE INDEX "alarms_standing" ON "alarms" USING btree ("lab_id") WHERE "alarms"."state" <> 'normal';--> statement-breakpoint
CREATE UNIQUE INDEX "push_subscriptions_endpoint" ON "push_subscriptions" USING btree ("endpoint");--> statement-breakpoint
ALTER TABLE "runs" ADD CONSTRAINT "runs_started_by_id_users_id_fk" FOREIGN KEY ("started_by_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;