CREATE TABLE "step_notes" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"run_id" uuid NOT NULL,
	"seq" integer NOT NULL,
	"text" text NOT NULL,
	"written_at" timestamp (6) with time zone NOT NULL,
	"written_by" text NOT NULL,
	CONSTRAINT "step_notes_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "step_notes" ADD CONSTRAINT "step_notes_step_fk" FOREIGN KEY ("lab_id","run_id","seq") REFERENCES "public"."run_steps"("lab_id","run_id","seq") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "step_notes_run" ON "step_notes" USING btree ("lab_id","run_id","seq","written_at");--> statement-breakpoint
-- What was written stays as it was; who was wrong writes another note.
CREATE TRIGGER "step_notes_immutable" BEFORE UPDATE OR DELETE ON "step_notes" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "step_notes_kept" BEFORE TRUNCATE ON "step_notes" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
