ALTER TABLE "alarm_history" ADD COLUMN "run_id" uuid;--> statement-breakpoint
CREATE INDEX "alarm_history_at" ON "alarm_history" USING btree ("lab_id","at");--> statement-breakpoint
CREATE INDEX "alarm_history_run" ON "alarm_history" USING btree ("lab_id","run_id");