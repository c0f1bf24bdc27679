ALTER TABLE "evaluations" ADD COLUMN "software" text;--> statement-breakpoint
ALTER TABLE "evaluations" ADD COLUMN "recomputes" uuid;--> statement-breakpoint
ALTER TABLE "evaluations" ADD COLUMN "frozen_at" timestamp (6) with time zone;--> statement-breakpoint
ALTER TABLE "evaluations" ADD COLUMN "frozen_by" text;--> statement-breakpoint
ALTER TABLE "evaluations" ADD COLUMN "frozen_reason" text;--> statement-breakpoint
-- One way: what is frozen stays as it was, whoever asks.
CREATE TRIGGER "evaluations_frozen" BEFORE UPDATE OR DELETE ON "evaluations" FOR EACH ROW WHEN (OLD.frozen_at IS NOT NULL) EXECUTE FUNCTION "refuse_change"();
