CREATE TABLE "caution_signatures" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"user_id" uuid NOT NULL,
	"version" integer NOT NULL,
	"name" text NOT NULL,
	"text_hash" text NOT NULL,
	"signed_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "caution_signatures_lab_id_rig_id_user_id_version_pk" PRIMARY KEY("lab_id","rig_id","user_id","version")
);
--> statement-breakpoint
CREATE TABLE "personal_locks" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"user_id" uuid NOT NULL,
	"name" text NOT NULL,
	"note" text DEFAULT '' NOT NULL,
	"set_at" timestamp (6) with time zone NOT NULL,
	"lifted_at" timestamp (6) with time zone,
	"lifted_by" text,
	"lifted_why" text,
	CONSTRAINT "personal_locks_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "caution_signatures" ADD CONSTRAINT "caution_signatures_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "caution_signatures" ADD CONSTRAINT "caution_signatures_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "personal_locks" ADD CONSTRAINT "personal_locks_user_id_users_id_fk" FOREIGN KEY ("user_id") REFERENCES "public"."users"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "personal_locks" ADD CONSTRAINT "personal_locks_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE UNIQUE INDEX "personal_locks_one_each" ON "personal_locks" USING btree ("lab_id","rig_id","user_id") WHERE "personal_locks"."lifted_at" is null;