CREATE TABLE "channel_calibrations" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid NOT NULL,
	"revision" integer NOT NULL,
	"valid_from" timestamp (6) with time zone NOT NULL,
	"offset" double precision NOT NULL,
	"slope" double precision NOT NULL,
	"u_offset" double precision NOT NULL,
	"u_slope" double precision NOT NULL,
	"covariance" double precision NOT NULL,
	"note" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by" text NOT NULL,
	CONSTRAINT "channel_calibrations_lab_id_channel_id_revision_pk" PRIMARY KEY("lab_id","channel_id","revision")
);
--> statement-breakpoint
ALTER TABLE "channel_calibrations" ADD CONSTRAINT "channel_calibrations_lab_id_channel_id_channels_lab_id_id_fk" FOREIGN KEY ("lab_id","channel_id") REFERENCES "public"."channels"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE TRIGGER "channel_calibrations_kept" BEFORE DELETE ON "channel_calibrations" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "channel_calibrations_immutable" BEFORE UPDATE ON "channel_calibrations" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "channel_calibrations_not_emptied" BEFORE TRUNCATE ON "channel_calibrations" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
