-- Samples, partitioned by time: the generator knows no partitions, so the empty table is made again with them.
DROP TABLE "samples";
--> statement-breakpoint
CREATE TABLE "samples" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"value" double precision NOT NULL,
	CONSTRAINT "samples_lab_id_channel_id_at_pk" PRIMARY KEY("lab_id","channel_id","at")
) PARTITION BY RANGE ("at");
--> statement-breakpoint
CREATE TABLE "samples_default" PARTITION OF "samples" DEFAULT;
--> statement-breakpoint
-- Makes the partitions of the months (UTC) from that of `from_at` on, `month_count` of them, where they are missing. Rows that already
-- lie in the default partition move over first, for PostgreSQL refuses a partition whose rows the default one holds.
CREATE FUNCTION "make_sample_partitions"("from_at" timestamptz, "month_count" integer) RETURNS integer LANGUAGE plpgsql AS $$
DECLARE
	month_start timestamptz;
	month_end timestamptz;
	part text;
	made integer := 0;
BEGIN
	FOR i IN 0 .. month_count - 1 LOOP
		month_start := (date_trunc('month', from_at AT TIME ZONE 'UTC') + make_interval(months => i)) AT TIME ZONE 'UTC';
		month_end := (date_trunc('month', from_at AT TIME ZONE 'UTC') + make_interval(months => i + 1)) AT TIME ZONE 'UTC';
		part := 'samples_' || to_char(month_start AT TIME ZONE 'UTC', 'YYYY_MM');
		CONTINUE WHEN to_regclass(part) IS NOT NULL;
		-- Two processes that find the same month missing make it one after the other.
		PERFORM pg_advisory_xact_lock(hashtext('make_sample_partitions'));
		CONTINUE WHEN to_regclass(part) IS NOT NULL;
		LOCK TABLE samples_default IN ACCESS EXCLUSIVE MODE;
		EXECUTE format('CREATE TABLE %I (LIKE samples INCLUDING ALL)', part);
		EXECUTE format('WITH moved AS (DELETE FROM samples_default WHERE at >= %L AND at < %L RETURNING *) INSERT INTO %I SELECT * FROM moved', month_start, month_end, part);
		EXECUTE format('ALTER TABLE samples ATTACH PARTITION %I FOR VALUES FROM (%L) TO (%L)', part, month_start, month_end);
		made := made + 1;
	END LOOP;
	RETURN made;
END;
$$;
--> statement-breakpoint
-- What was issued, logged or audited stays as it was, whoever asks.
CREATE FUNCTION "refuse_change"() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
	RAISE EXCEPTION 'rows of % are never changed or deleted', TG_TABLE_NAME USING ERRCODE = 'restrict_violation';
END;
$$;
--> statement-breakpoint
CREATE TRIGGER "rig_revisions_immutable" BEFORE UPDATE OR DELETE ON "rig_revisions" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "rig_revisions_kept" BEFORE TRUNCATE ON "rig_revisions" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "protocol_revisions_immutable" BEFORE UPDATE OR DELETE ON "protocol_revisions" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "protocol_revisions_kept" BEFORE TRUNCATE ON "protocol_revisions" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "run_events_immutable" BEFORE UPDATE OR DELETE ON "run_events" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "run_events_kept" BEFORE TRUNCATE ON "run_events" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "audit_immutable" BEFORE UPDATE OR DELETE ON "audit" FOR EACH ROW EXECUTE FUNCTION "refuse_change"();
--> statement-breakpoint
CREATE TRIGGER "audit_kept" BEFORE TRUNCATE ON "audit" FOR EACH STATEMENT EXECUTE FUNCTION "refuse_change"();
