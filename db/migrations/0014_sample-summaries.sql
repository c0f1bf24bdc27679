CREATE TABLE "sample_summaries" (
	"lab_id" uuid NOT NULL,
	"channel_id" uuid NOT NULL,
	"level" smallint NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"count" bigint NOT NULL,
	"least" double precision NOT NULL,
	"least_at" timestamp (6) with time zone NOT NULL,
	"greatest" double precision NOT NULL,
	"greatest_at" timestamp (6) with time zone NOT NULL,
	"mean" double precision NOT NULL,
	CONSTRAINT "sample_summaries_lab_id_channel_id_level_at_pk" PRIMARY KEY("lab_id","channel_id","level","at")
) WITH (fillfactor = 90);
--> statement-breakpoint
-- Start of the bucket of an instant. Buckets of every level are aligned to the epoch; the origin lies a whole number of the widest ones before it.
CREATE FUNCTION "bucket_of"("width" interval, "instant" timestamptz) RETURNS timestamptz LANGUAGE sql IMMUTABLE PARALLEL SAFE AS $$
	SELECT date_bin(width, instant, timestamptz '0108-03-31 11:33:20+00 BC')
$$;
--> statement-breakpoint
-- A value times 2 to the power of -60, so that no sum of finite values overflows; what would underflow counts as nothing.
CREATE FUNCTION "scaled_down"("value" double precision) RETURNS double precision LANGUAGE sql IMMUTABLE PARALLEL SAFE AS $$
	SELECT CASE WHEN abs(value) < 1e-280 THEN 0 ELSE value * 8.673617379884035e-19 END
$$;
--> statement-breakpoint
-- The mean of `number` values whose scaled-down sum is `total`; rounding leads it neither below the least nor above the greatest of them.
CREATE FUNCTION "scaled_up_mean"("total" double precision, "number" double precision, "least_value" double precision, "greatest_value" double precision) RETURNS double precision LANGUAGE sql IMMUTABLE PARALLEL SAFE AS $$
	SELECT least(scaled_down(greatest_value), greatest(scaled_down(least_value), total / number)) * 1152921504606846976
$$;
--> statement-breakpoint
-- Computes the buckets of level 0 in some stretches anew from the samples, and those above from the ones below. It adds nothing up, so it does not matter in
-- which order samples came, or whether twice. A stretch begins with a bucket and ends before one; no two have a bucket in common. `emptied`: samples were
-- taken away, and a bucket may be left without any.
CREATE FUNCTION "summarise_level_0"("lab" uuid, "channel" uuid, "froms" timestamptz[], "tos" timestamptz[], "emptied" boolean DEFAULT false) RETURNS void LANGUAGE plpgsql AS $$
BEGIN
	IF emptied THEN
		DELETE FROM sample_summaries s USING unnest(froms, tos) AS stretch (since, until)
		WHERE s.lab_id = lab AND s.channel_id = channel AND s.level = 0 AND s.at >= since AND s.at < until;
	END IF;
	INSERT INTO sample_summaries
	SELECT lab, channel, 0, found.* FROM unnest(froms, tos) AS stretch (since, until) CROSS JOIN LATERAL (
		SELECT bucket_of('2 s', at), count(*), min(value), (array_agg(at ORDER BY value, at))[1], max(value), (array_agg(at ORDER BY value DESC, at))[1],
			scaled_up_mean(sum(scaled_down(value)), count(*), min(value), max(value))
		FROM samples WHERE lab_id = lab AND channel_id = channel AND at >= since AND at < until GROUP BY 1) AS found
	ON CONFLICT (lab_id, channel_id, level, at) DO UPDATE SET count = excluded.count, least = excluded.least, least_at = excluded.least_at,
		greatest = excluded.greatest, greatest_at = excluded.greatest_at, mean = excluded.mean;
END;
$$;
--> statement-breakpoint
CREATE FUNCTION "summarise_above"("lab" uuid, "channel" uuid, "froms" timestamptz[], "tos" timestamptz[], "emptied" boolean DEFAULT false) RETURNS void LANGUAGE plpgsql AS $$
DECLARE
	width interval := '2 s';
	touched timestamptz[];
BEGIN
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
CREATE FUNCTION "summarise_samples"("lab" uuid, "channel" uuid, "froms" timestamptz[], "tos" timestamptz[], "emptied" boolean DEFAULT false) RETURNS void LANGUAGE plpgsql AS $$
BEGIN
	PERFORM summarise_level_0(lab, channel, froms, tos, emptied);
	PERFORM summarise_above(lab, channel, froms, tos, emptied);
END;
$$;
--> statement-breakpoint
-- The same for buckets by their starts.
CREATE FUNCTION "summarise_buckets"("lab" uuid, "channel" uuid, "buckets" timestamptz[], "emptied" boolean DEFAULT false) RETURNS void LANGUAGE sql AS $$
	SELECT summarise_samples(lab, channel, buckets, ARRAY(SELECT b + interval '2 s' FROM unnest(buckets) WITH ORDINALITY AS listed (b, place) ORDER BY place), emptied)
$$;
--> statement-breakpoint
-- Whoever takes samples away, by whatever way: the summaries follow. (Lock the row of the channel before, FOR NO KEY UPDATE, as those do who add samples: who
-- deletes first and waits for it then may find that they wait for each other.) Those who add them say so themselves, for a trigger on INSERT would cost COPY half its speed.
CREATE FUNCTION "summarise_changed_samples"() RETURNS trigger LANGUAGE plpgsql AS $$
DECLARE
	one record;
BEGIN
	FOR one IN SELECT lab_id, channel_id, array_agg(DISTINCT bucket_of('2 s', at)) AS buckets FROM gone GROUP BY lab_id, channel_id ORDER BY lab_id, channel_id LOOP
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
CREATE FUNCTION "forget_sample_summaries"() RETURNS trigger LANGUAGE plpgsql AS $$
BEGIN
	TRUNCATE sample_summaries;
	RETURN NULL;
END;
$$;
--> statement-breakpoint
-- Months of which the default partition holds many samples get partitions of their own; those of a few stray instants do not.
CREATE FUNCTION "settle_stray_samples"("many" bigint) RETURNS integer LANGUAGE plpgsql AS $$
DECLARE
	month_start timestamptz;
	made integer := 0;
BEGIN
	FOREACH month_start IN ARRAY ARRAY(
		SELECT date_trunc('month', at AT TIME ZONE 'UTC') AT TIME ZONE 'UTC' FROM samples_default GROUP BY 1 HAVING count(*) >= many ORDER BY 1)
	LOOP
		made := made + make_sample_partitions(month_start, 1);
	END LOOP;
	RETURN made;
END;
$$;
--> statement-breakpoint
SELECT settle_stray_samples(10000);
--> statement-breakpoint
DO $$
DECLARE
	one record;
BEGIN
	FOR one IN SELECT lab_id, id FROM channels LOOP
		PERFORM summarise_buckets(one.lab_id, one.id, ARRAY(SELECT DISTINCT bucket_of('2 s', at) FROM samples WHERE lab_id = one.lab_id AND channel_id = one.id));
	END LOOP;
END;
$$;
--> statement-breakpoint
CREATE TRIGGER "samples_taken_away" AFTER DELETE ON "samples" REFERENCING OLD TABLE AS gone FOR EACH STATEMENT EXECUTE FUNCTION "summarise_changed_samples"();
--> statement-breakpoint
CREATE TRIGGER "samples_changed" AFTER UPDATE ON "samples" REFERENCING OLD TABLE AS gone NEW TABLE AS come FOR EACH STATEMENT EXECUTE FUNCTION "summarise_changed_samples"();
--> statement-breakpoint
CREATE TRIGGER "samples_emptied" AFTER TRUNCATE ON "samples" FOR EACH STATEMENT EXECUTE FUNCTION "forget_sample_summaries"();
