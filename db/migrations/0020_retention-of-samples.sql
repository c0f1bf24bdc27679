CREATE TABLE "retention_rules" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid,
	"as_lab" boolean NOT NULL,
	"keep_days" integer,
	"decided_at" timestamp (6) with time zone NOT NULL,
	"decided_by" text NOT NULL,
	CONSTRAINT "retention_rules_one" UNIQUE NULLS NOT DISTINCT("lab_id","channel_id")
);
--> statement-breakpoint
CREATE TABLE "thinned_stretches" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid NOT NULL,
	"from_at" timestamp (6) with time zone NOT NULL,
	"to_at" timestamp (6) with time zone NOT NULL,
	"samples" bigint NOT NULL,
	"untold" bigint NOT NULL,
	"thinned_at" timestamp (6) with time zone NOT NULL,
	CONSTRAINT "thinned_stretches_lab_id_channel_id_from_at_pk" PRIMARY KEY("lab_id","channel_id","from_at")
);
--> statement-breakpoint
ALTER TABLE "retention_rules" ADD CONSTRAINT "retention_rules_lab_id_labs_id_fk" FOREIGN KEY ("lab_id") REFERENCES "public"."labs"("id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "retention_rules" ADD CONSTRAINT "retention_rules_lab_id_channel_id_channels_lab_id_id_fk" FOREIGN KEY ("lab_id","channel_id") REFERENCES "public"."channels"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "thinned_stretches" ADD CONSTRAINT "thinned_stretches_lab_id_channel_id_channels_lab_id_id_fk" FOREIGN KEY ("lab_id","channel_id") REFERENCES "public"."channels"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
-- Where summaries alone are left they are all that is known: a sample that came in there would be taken for the whole of its bucket, so whoever brings one is refused.
CREATE FUNCTION "refuse_thinned"("lab" uuid, "channel" uuid, "froms" timestamptz[], "tos" timestamptz[]) RETURNS void LANGUAGE plpgsql AS $$
DECLARE
	met record;
BEGIN
	SELECT t.from_at, t.to_at INTO met FROM unnest(froms, tos) AS stretch (since, until) JOIN thinned_stretches t
		ON t.lab_id = lab AND t.channel_id = channel AND t.from_at < until AND t.to_at > since ORDER BY t.from_at LIMIT 1;
	IF FOUND THEN
		RAISE EXCEPTION 'summaries alone are left of this channel from % to %', met.from_at, met.to_at
			USING ERRCODE = 'EVTHN', DETAIL = channel::text || ' ' || to_json(met.from_at)::text || ' ' || to_json(met.to_at)::text;
	END IF;
END;
$$;
--> statement-breakpoint
CREATE OR REPLACE FUNCTION "summarise_above"("lab" uuid, "channel" uuid, "froms" timestamptz[], "tos" timestamptz[], "emptied" boolean DEFAULT false) RETURNS void LANGUAGE plpgsql AS $$
DECLARE
	width interval := '2 s';
	touched timestamptz[];
BEGIN
	PERFORM refuse_thinned(lab, channel, froms, tos);
	touched := ARRAY(SELECT DISTINCT t FROM unnest(froms, tos) AS stretch (since, until), generate_series(bucket_of('16 s', since), until - interval '1 us', '16 s') AS t ORDER BY 1);
	FOR upper_level IN 1 .. 5 LOOP
		width := width * 8;
		IF upper_level > 1 THEN
			touched := ARRAY(SELECT DISTINCT bucket_of(width, t) FROM unnest(touched) AS t ORDER BY 1);
		END IF;
		IF emptied THEN
			DELETE FROM sample_summaries s WHERE s.lab_id = lab AND s.channel_id = channel AND s.level = upper_level AND s.at = ANY (touched);
		END IF;
		INSERT INTO sample_summaries
		SELECT lab, channel, upper_level, t, found.* FROM unnest(touched) AS t CROSS JOIN LATERAL (
			SELECT sum(count), min(least), (array_agg(least_at ORDER BY least, least_at))[1], max(greatest), (array_agg(greatest_at ORDER BY greatest DESC, greatest_at))[1],
				scaled_up_mean(sum(scaled_down(mean) * count), sum(count)::double precision, min(least), max(greatest))
			FROM sample_summaries WHERE lab_id = lab AND channel_id = channel AND level = upper_level - 1 AND at >= t AND at < t + width HAVING count(*) > 0) AS found
		ON CONFLICT (lab_id, channel_id, level, at) DO UPDATE SET count = excluded.count, least = excluded.least, least_at = excluded.least_at,
			greatest = excluded.greatest, greatest_at = excluded.greatest_at, mean = excluded.mean;
	END LOOP;
END;
$$;
--> statement-breakpoint
-- Samples of which the summaries are to stay (their stretch was entered into thinned_stretches before, in the same transaction) leave them as they are.
CREATE OR REPLACE FUNCTION "summarise_changed_samples"() RETURNS trigger LANGUAGE plpgsql AS $$
DECLARE
	one record;
BEGIN
	FOR one IN
		SELECT lab_id, channel_id, array_agg(bucket) AS buckets FROM (SELECT DISTINCT lab_id, channel_id, bucket_of('2 s', at) AS bucket FROM gone) AS touched
		WHERE NOT EXISTS (
			SELECT 1 FROM thinned_stretches t WHERE t.lab_id = touched.lab_id AND t.channel_id = touched.channel_id AND t.from_at <= bucket AND t.to_at > bucket)
		GROUP BY lab_id, channel_id ORDER BY lab_id, channel_id
	LOOP
		PERFORM 1 FROM channels WHERE lab_id = one.lab_id AND id = one.channel_id FOR NO KEY UPDATE;
		PERFORM summarise_buckets(one.lab_id, one.channel_id, one.buckets, true);
	END LOOP;
	IF TG_OP = 'UPDATE' THEN
		FOR one IN SELECT lab_id, channel_id, array_agg(DISTINCT bucket_of('2 s', at)) AS buckets FROM come GROUP BY lab_id, channel_id ORDER BY lab_id, channel_id LOOP
			PERFORM 1 FROM channels WHERE lab_id = one.lab_id AND id = one.channel_id FOR NO KEY UPDATE;
			PERFORM summarise_buckets(one.lab_id, one.channel_id, one.buckets);
		END LOOP;
	END IF;
	RETURN NULL;
END;
$$;
--> statement-breakpoint
CREATE OR REPLACE FUNCTION "forget_sample_summaries"() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
	TRUNCATE sample_summaries, thinned_stretches;
	RETURN NULL;
END;
$$;
--> statement-breakpoint
ALTER TABLE "thinned_stretches" ADD CONSTRAINT "thinned_stretches_whole_buckets" CHECK (from_at < to_at AND bucket_of('2 s', from_at) = from_at AND bucket_of('2 s', to_at) = to_at);
