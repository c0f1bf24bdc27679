CREATE TABLE "brokers" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"address" text NOT NULL,
	"user_name" text,
	"password" text,
	"topics" json NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by" text NOT NULL,
	"removed_at" timestamp (6) with time zone,
	"removed_by" text,
	"status" json,
	CONSTRAINT "brokers_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "brokers" ADD CONSTRAINT "brokers_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "brokers_rig" ON "brokers" USING btree ("lab_id","rig_id");