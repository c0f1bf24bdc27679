CREATE TABLE "device_tokens" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"name" text NOT NULL,
	"token_hash" text NOT NULL,
	"channels" json NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by" text NOT NULL,
	"last_used_at" timestamp (6) with time zone,
	"revoked_at" timestamp (6) with time zone,
	"revoked_by" text,
	CONSTRAINT "device_tokens_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "channels" ADD COLUMN "rate_hz" double precision;--> statement-breakpoint
ALTER TABLE "device_tokens" ADD CONSTRAINT "device_tokens_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE UNIQUE INDEX "device_tokens_hash" ON "device_tokens" USING btree ("token_hash");--> statement-breakpoint
CREATE INDEX "device_tokens_rig" ON "device_tokens" USING btree ("lab_id","rig_id");