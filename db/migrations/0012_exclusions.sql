CREATE TABLE "exclusions" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"run_id" uuid NOT NULL,
	"start_at" timestamp (6) with time zone NOT NULL,
	"end_at" timestamp (6) with time zone NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by" text NOT NULL,
	"reason" text NOT NULL,
	"withdrawn_at" timestamp (6) with time zone,
	"withdrawn_by" text,
	"withdrawn_reason" text,
	CONSTRAINT "exclusions_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "exclusions" ADD CONSTRAINT "exclusions_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "exclusions_run" ON "exclusions" USING btree ("lab_id","run_id","start_at");--> statement-breakpoint
-- What was excluded, by whom and why is kept for ever: it can only be withdrawn, once.
CREATE TRIGGER "exclusions_kept" BEFORE DELETE ON "exclusions" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "exclusions_immutable" BEFORE UPDATE ON "exclusions" FOR EACH ROW WHEN (
	OLD.withdrawn_at IS NOT NULL
	OR (OLD.lab_id, OLD.id, OLD.run_id, OLD.start_at, OLD.end_at, OLD.made_at, OLD.made_by, OLD.reason)
		IS DISTINCT FROM (NEW.lab_id, NEW.id, NEW.run_id, NEW.start_at, NEW.end_at, NEW.made_at, NEW.made_by, NEW.reason)
) EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "exclusions_not_emptied" BEFORE TRUNCATE ON "exclusions" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
