import * as fc from 'fast-check';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import { topLevel, widthUs } from '@/server/store/sample-levels';
import { settleSamples } from '@/server/store/sample-months';
import { createSampleStore } from '@/server/store/sample-store';
import { countSamples, extremesOf, lastSampleUtcMs, sumsOf } from '@/server/store/sample-summaries';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeChannel, makeLab, makeRig } from './rows';

/** Whatever comes in whatever order, and whatever is taken away: the summaries say what a computation from all samples says. */

const database = databaseOfThisFile();
const allTime = { fromUtcMs: Date.parse('1970-01-01'), toUtcMs: Date.parse('2200-01-01') };

async function freshChannel() {
  const { connection } = database();
  const lab = await makeLab(connection.db);
  const channel = { labId: lab.id, channelId: await makeChannel(connection.db, lab.id, await makeRig(connection.db, lab.id)) };
  const store = createSampleStore(connection);
  return {
    connection,
    channel,
    append: (batch: SampleBatch) => store.append(channel.labId, channel.channelId, batch),
    // As every writer does, it takes the row of the channel first.
    takeAway: (fromUtcMs: number, toUtcMs: number) =>
      connection.bulk(async (client) => {
        const own = [channel.labId, channel.channelId];
        await client.query('select 1 from channels where lab_id = $1 and id = $2 for no key update', own);
        const ends = [timestampOfUtcMs(fromUtcMs), timestampOfUtcMs(toUtcMs)];
        await client.query('delete from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4', [...own, ...ends]);
      }),
    read: (window = allTime) => store.read(channel.labId, channel.channelId, window),
  };
}
type Channel = Awaited<ReturnType<typeof freshChannel>>;

interface Plain {
  count: number;
  least: number;
  leastMs: number;
  greatest: number;
  greatestMs: number;
}

/** Of samples in order of time. */
function plainSummary(samples: readonly { ms: number; value: number }[]): Plain & { mean: number } {
  const low = samples.reduce((best, sample) => (sample.value < best.value ? sample : best));
  const high = samples.reduce((best, sample) => (sample.value > best.value ? sample : best));
  const mean = samples.reduce((sum, { value }) => sum + value / samples.length, 0);
  return { count: samples.length, least: low.value, leastMs: low.ms, greatest: high.value, greatestMs: high.ms, mean };
}

const pairs = ({ utcMs, value }: SampleBatch) => [...utcMs].map((ms, index) => ({ ms, value: value[index] as number }));
/** Rounding of sums of a few thousand values of this size. */
const meansAgree = (one: number, other: number, size: number) => expect(Math.abs(one - other)).toBeLessThanOrEqual(1e-12 * size);

async function expectRight({ connection, channel, read }: Channel): Promise<void> {
  const samples = pairs(await read());
  const size = Math.max(0, ...samples.map(({ value }) => Math.abs(value)));
  const { rows } = await connection.pool.query<Plain & { level: number; us: number; mean: number }>(
    `select level, (extract(epoch from at) * 1e6)::double precision as us, count::double precision, mean, least, (extract(epoch from least_at) * 1000)::double precision as "leastMs",
       greatest, (extract(epoch from greatest_at) * 1000)::double precision as "greatestMs"
     from sample_summaries where lab_id = $1 and channel_id = $2 order by level, at`,
    [channel.labId, channel.channelId],
  );
  for (let level = 0; level <= topLevel; level += 1) {
    const groups = new Map<number, { ms: number; value: number }[]>();
    for (const sample of samples) {
      const start = Math.floor((sample.ms * 1000) / widthUs(level)) * widthUs(level);
      groups.set(start, [...(groups.get(start) ?? []), sample]);
    }
    const stored = rows.filter((row) => row.level === level);
    const wanted = [...groups].map(([us, group]) => ({ us, ...plainSummary(group) }));
    expect(stored.map(({ level: _level, mean: _mean, ...plain }) => plain)).toEqual(wanted.map(({ mean: _mean, ...plain }) => plain));
    for (const [index, { mean }] of stored.entries()) meansAgree(mean, wanted[index]?.mean ?? NaN, size);
  }
}

const batch = (samples: readonly { ms: number; value: number }[]): SampleBatch => ({
  utcMs: Float64Array.from(samples, ({ ms }) => ms),
  value: Float64Array.from(samples, ({ value }) => value),
});

/** Instants crowd around a few places, an edge of buckets among them, so that batches hit what is there already. */
const instant = fc
  .record({
    place: fc.constantFrom(0, 1_999.999, 131_072_000, 86_400_000 * 40),
    offset: fc.integer({ min: -60, max: 60 }),
    step: fc.constantFrom(0.001, 100, 7001),
  })
  .map(({ place, offset, step }) => eveningUtcMs + place + offset * step)
  .map((ms) => Math.round(ms * 1000) / 1000);
const value = fc.integer({ min: -1000, max: 1000 }).map((number) => number / 7);
const deed = fc.oneof(
  { weight: 3, arbitrary: fc.record({ add: fc.array(fc.record({ ms: instant, value }), { minLength: 1, maxLength: 40 }) }) },
  { weight: 1, arbitrary: fc.record({ from: instant, to: instant }) },
);

test('every bucket of every level is right after late, unordered and repeated samples and after deletions, and so is the sum of any window', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc.array(deed, { minLength: 1, maxLength: 6 }),
      fc.array(fc.tuple(instant, instant), { minLength: 4, maxLength: 4 }),
      async (deeds, ends) => {
        const own = await freshChannel();
        for (const one of deeds)
          await ('add' in one ? own.append(batch(one.add)) : own.takeAway(Math.min(one.from, one.to), Math.max(one.from, one.to)));
        await expectRight(own);
        const windows = ends.map(([one, other]) => ({ fromUtcMs: Math.min(one, other), toUtcMs: Math.max(one, other) }));
        const sums = await sumsOf(own.connection, own.channel, windows);
        for (const [index, window] of windows.entries()) {
          const within = pairs(await own.read(window));
          const sum = sums[index];
          if (within.length === 0) expect(sum).toEqual({ count: 0, least: null, greatest: null, mean: null });
          else {
            const { count, least, greatest, mean } = plainSummary(within);
            expect(sum).toMatchObject({ count, least, greatest });
            meansAgree(sum?.mean ?? NaN, mean, 1000);
          }
        }
      },
    ),
    { numRuns: 12 },
  );
});

test('a batch by COPY into empty time makes the same summaries, beside samples in the buckets of its ends and among equal values too', async () => {
  const own = await freshChannel();
  const many = Array.from({ length: 2400 }, (_, index) => ({
    ms: eveningUtcMs + 1_000 + 90 * index + 0.457,
    value: Math.round(20 * Math.sin(index / 9)) / 7,
  }));
  await own.append(
    batch([
      { ms: eveningUtcMs + 10, value: 9 },
      { ms: eveningUtcMs + 1_000 + 90 * 2400, value: -9 },
    ]),
  );
  expect(await own.append(batch([...many].reverse()))).toEqual({ stored: 2400, known: 0 });
  await expectRight(own);
});

test('writers and one who deletes, all at once, leave summaries of what is there', async () => {
  const own = await freshChannel();
  const at = (index: number) => ({ ms: eveningUtcMs + index * 90, value: Math.sin(index / 5) });
  const third = (remainder: number) => batch(Array.from({ length: 300 }, (_, index) => at(3 * index + remainder)));
  await own.append(third(0));
  await Promise.all([
    own.append(third(1)),
    own.takeAway(eveningUtcMs + 4000, eveningUtcMs + 9000),
    own.append(third(2)),
    own.append(third(1)),
  ]);
  await expectRight(own);
});

test('values as great and as small as a double goes are stored, and their mean lies between them', async () => {
  const own = await freshChannel();
  const values = [
    Number.MAX_VALUE,
    Number.MAX_VALUE,
    1.5e308,
    Number.MIN_VALUE,
    -Number.MAX_VALUE,
    -Number.MIN_VALUE,
    1e-310,
    Number.MAX_VALUE,
  ];
  await own.append(batch(values.map((one, index) => ({ ms: eveningUtcMs + 400 * index, value: one }))));
  expect([...(await own.read()).value]).toEqual(values);
  const [sum] = await sumsOf(own.connection, own.channel, [allTime]);
  expect(sum).toMatchObject({ count: 8, least: -Number.MAX_VALUE, greatest: Number.MAX_VALUE });
  expect((sum?.mean ?? NaN) / (Number.MAX_VALUE / 4 + 1.5e308 / 8)).toBeCloseTo(1, 12);
});

describe('a long time of many samples with two spikes', () => {
  let own: Channel;
  const minute = 60_000;
  const spikes = [
    { ms: eveningUtcMs + 25 * minute + 0.123, value: 40 },
    { ms: eveningUtcMs + 50 * minute + 0.456, value: -50 },
  ];
  const count = 42_000;
  const window = { fromUtcMs: eveningUtcMs, toUtcMs: eveningUtcMs + 100 * count };
  beforeAll(async () => {
    own = await freshChannel();
    await own.append(
      batch(Array.from({ length: count }, (_, index) => ({ ms: eveningUtcMs + 100 * index, value: Math.sin(index / 3000) }))),
    );
    // Late, and alone.
    await own.append(batch(spikes));
  });
  const view = (cells: number, part = window, total = count) => extremesOf(own.connection, { ...own.channel, ...part }, { cells, total });

  test.each([
    [500, 10],
    [30, 256],
  ])('a plot of %i cells has the spikes at their instants, in order of time', async (cells, widthS) => {
    expect(await countSamples(own.connection, { ...own.channel, ...window })).toBe(count + 2);
    const { utcMs, value: shown } = await view(cells);
    expect(shown.length).toBeGreaterThan((2 * 0.9 * 4200) / widthS);
    expect(shown.length).toBeLessThanOrEqual(2 * cells);
    expect(utcMs).toEqual([...utcMs].sort((one, other) => one - other));
    for (const { ms, value: spike } of spikes) expect(utcMs[shown.indexOf(spike)]).toBeCloseTo(ms, 2);
  });

  test.each([
    ['buckets', count],
    ['samples', 1000],
  ])('each point is a sample of the window, its least and its greatest among them: from %s', async (_from, total) => {
    const part = { fromUtcMs: window.fromUtcMs + 34_567, toUtcMs: window.toUtcMs - 654_321 };
    const { utcMs, value: shown } = await view(60, part, total);
    const known = new Map(pairs(await own.read(part)).map(({ ms, value: one }) => [Math.round(ms * 1000), one]));
    expect(utcMs.map((ms) => known.get(Math.round(ms * 1000)))).toEqual(shown);
    expect([Math.min(...shown), Math.max(...shown)]).toEqual([Math.min(...known.values()), Math.max(...known.values())]);
    expect(shown.length).toBeGreaterThan(50);
    expect(shown.length).toBeLessThanOrEqual(120);
  });

  test('the last sample is found, and none where all were taken away', async () => {
    expect(await lastSampleUtcMs(own.connection, own.channel)).toBe(eveningUtcMs + 100 * (count - 1));
    await own.takeAway(allTime.fromUtcMs, allTime.toUtcMs);
    expect(await lastSampleUtcMs(own.connection, own.channel)).toBeNull();
    expect(await view(500)).toEqual({ utcMs: [], value: [] });
    await expectRight(own);
  });
});

test('a month gets its partition when many samples of it come, and strays of other months do not', async () => {
  const own = await freshChannel();
  const placesOf = async () =>
    (
      await own.connection.pool.query('select distinct tableoid::regclass::text as place from samples where channel_id = $1 order by 1', [
        own.channel.channelId,
      ])
    ).rows.map(({ place }) => place);
  const march = Date.parse('2027-03-30T00:00:00Z');
  await own.append(batch(Array.from({ length: 2500 }, (_, index) => ({ ms: march + 100 * index, value: index }))));
  await own.append(batch([{ ms: Date.parse('2026-11-11'), value: 1 }]));
  expect(await placesOf()).toEqual(['samples_2027_03', 'samples_default']);
  await own.connection.pool.query('select settle_stray_samples(3)');
  expect(await placesOf()).toEqual(['samples_2027_03', 'samples_default']);
  await own.connection.pool.query('select settle_stray_samples(1)');
  expect(await placesOf()).toEqual(['samples_2026_11', 'samples_2027_03']);
  await expectRight(own);
});

test('several who make the same months at once, and one while somebody writes strays, do not fail', async () => {
  const { connection } = await freshChannel();
  const nowUtcMs = Date.parse('2034-02-01T00:00:00Z');
  await Promise.all([1, 2, 3].map(() => settleSamples(connection.db, { nowUtcMs, monthsAhead: 3 })));
  const placeOf = async (name: string) => (await connection.pool.query('select to_regclass($1)::text as place', [name])).rows[0].place;
  expect(await placeOf('samples_2034_04')).toBe('samples_2034_04');
  await connection.bulk(async (client) => {
    await client.query('lock table samples_default in row exclusive mode');
    await settleSamples(connection.db, { nowUtcMs: Date.parse('2035-02-01T00:00:00Z'), monthsAhead: 1 });
  });
  expect(await placeOf('samples_2035_02')).toBeNull();
});
