import { and, eq } from 'drizzle-orm';
import * as fc from 'fast-check';
import { runs } from '@/db/schema';
import { createSampleStore } from '@/server/store/sample-store';
import { thinnedWithin } from '@/server/store/retention';
import { extremesOf, lastSampleOf, sumsOf } from '@/server/store/sample-summaries';
import { storeBatches } from '@/server/store/device-tokens';
import { ThinnedSamplesError } from '@/server/store/thinned-error';
import { takeUntold, thinNext, UnsoundSummariesError, wouldGo } from '@/server/store/thinning';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeChannel, makeLab, makeRig, makeRun, runStart } from './rows';

/** Old samples go, their summaries stay, and what a run needs is never touched. */

const database = databaseOfThisFile();
const hourMs = 3_600_000;
const allTime = { fromUtcMs: Date.parse('1970-01-01'), toUtcMs: Date.parse('2200-01-01') };
const nowUtcMs = eveningUtcMs + 1000 * hourMs;

interface Sample {
  ms: number;
  value: number;
}
interface Span {
  fromUtcMs: number;
  toUtcMs: number;
}

async function freshChannel(samples: readonly Sample[], spans: readonly Span[] = []) {
  const { connection } = database();
  const { db, pool } = connection;
  const lab = await makeLab(db);
  const rigId = await makeRig(db, lab.id);
  const channel = { labId: lab.id, channelId: await makeChannel(db, lab.id, rigId), rigId };
  for (const { fromUtcMs, toUtcMs } of spans) {
    const start = runStart(lab.id, rigId);
    await makeRun(db, start);
    await db
      .update(runs)
      .set({ state: 'finished', outcome: 'finished', createdAt: fromUtcMs, startedAt: fromUtcMs, endedAt: toUtcMs })
      .where(and(eq(runs.labId, lab.id), eq(runs.id, start.runId)));
  }
  const store = createSampleStore(connection);
  const append = (more: readonly Sample[]) =>
    storeBatches(connection, lab.id, [
      {
        channelId: channel.channelId,
        utcMs: Float64Array.from(more, ({ ms }) => ms),
        value: Float64Array.from(more, ({ value }) => value),
      },
    ]);
  await append(samples);
  const own = [channel.labId, channel.channelId];
  return {
    connection,
    channel,
    append,
    left: async () => [...(await store.read(channel.labId, channel.channelId, allTime)).utcMs],
    summaries: async () =>
      (await pool.query('select * from sample_summaries where lab_id = $1 and channel_id = $2 order by level, at', own)).rows,
    /** So many steps, or all of them. */
    thin: async (cutoffUtcMs: number, { steps = 10_000, atOnce = 20_000 } = {}) => {
      let gone = 0;
      for (let step = 0; step < steps; step += 1) {
        const done = await thinNext(connection, channel, { cutoffUtcMs, nowUtcMs, atOnce });
        if (done === null) break;
        gone += done.samples;
      }
      return gone;
    },
  };
}

/** A sample every so many seconds. */
const even = (hours: number, everyS: number): Sample[] =>
  Array.from({ length: Math.round((hours * 3600) / everyS) }, (_, index) => ({
    ms: eveningUtcMs + index * everyS * 1000,
    value: Math.sin(index / 7) * 100,
  }));

const crowded = fc
  .record({ hour: fc.integer({ min: 0, max: 30 }), offset: fc.integer({ min: -40, max: 40 }), step: fc.constantFrom(0.001, 300, 45_001) })
  .map(({ hour, offset, step }) => Math.round((eveningUtcMs + hour * hourMs + offset * step) * 1000) / 1000);
const span = fc
  .record({ from: fc.double({ min: 0, max: 30, noNaN: true }), hours: fc.double({ min: 0.001, max: 5, noNaN: true }) })
  .map(({ from, hours }) => {
    const fromUtcMs = Math.round(eveningUtcMs + from * hourMs);
    return { fromUtcMs, toUtcMs: fromUtcMs + Math.round(hours * hourMs) };
  });
const samplesOf = fc
  .uniqueArray(crowded, { minLength: 1, maxLength: 150 })
  .chain((instants) =>
    fc
      .array(fc.integer({ min: -900, max: 900 }), { minLength: instants.length, maxLength: instants.length })
      .map((values) => instants.map((ms, index) => ({ ms, value: (values[index] as number) / 7 }))),
  );

/** What the rule says, sample by sample: the 2 s in which it lies end before the cutoff and touch no run with its hour before and after. */
function mayGo(ms: number, cutoffUtcMs: number, spans: readonly Span[]): boolean {
  const from = Math.floor(Math.round(ms * 1000) / 2_000_000) * 2000;
  const to = from + 2000;
  return to <= cutoffUtcMs && spans.every(({ fromUtcMs, toUtcMs }) => to <= fromUtcMs - hourMs || from >= toUtcMs + hourMs);
}

test('exactly what no run needs goes, wherever it is broken off; every summary stays, and a plot of old time shows the same', async () => {
  await fc.assert(
    fc.asyncProperty(
      samplesOf,
      fc.array(span, { maxLength: 3 }),
      fc.record({ cutoff: crowded, atOnce: fc.integer({ min: 1, max: 40 }), steps: fc.integer({ min: 0, max: 4 }) }),
      fc.array(fc.tuple(crowded, crowded), { minLength: 3, maxLength: 3 }),
      async (samples, spans, { cutoff, atOnce, steps }, ends) => {
        const own = await freshChannel(samples, spans);
        const { connection, channel } = own;
        const bucket = (ms: number) => Math.floor(ms / 2000) * 2000;
        const windows = ends.map(([one, other]) => ({
          fromUtcMs: bucket(Math.min(one, other)),
          toUtcMs: bucket(Math.max(one, other)) + 2000 - 0.001,
        }));
        const seen = async () => ({
          sums: await sumsOf(connection, channel, windows),
          // As of more samples than are read one by one.
          plots: await Promise.all(
            windows.map((window) => extremesOf(connection, { ...channel, ...window }, { cells: 40, total: 50_000 })),
          ),
        });
        const [summaries, before] = [await own.summaries(), await seen()];
        const wanted = samples.filter(({ ms }) => mayGo(ms, cutoff, spans)).length;
        const stay = samples.filter(({ ms }) => !mayGo(ms, cutoff, spans)).map(({ ms }) => ms);
        const told = await wouldGo(connection, channel, cutoff);
        expect(told.samples).toBe(wanted);
        expect(told.kept).toBe(samples.filter(({ ms }) => bucket(ms) + 2000 <= cutoff && !mayGo(ms, cutoff, spans)).length);

        const first = await own.thin(cutoff, { steps, atOnce });
        const left = await own.left();
        expect(left).toHaveLength(samples.length - first);
        expect(left).toEqual(expect.arrayContaining(stay));
        expect((await wouldGo(connection, channel, cutoff)).samples).toBe(wanted - first);
        expect(await own.summaries()).toEqual(summaries);
        expect(await seen()).toEqual(before);

        expect(first + (await own.thin(cutoff, { atOnce }))).toBe(wanted);
        expect(await own.left()).toEqual([...stay].sort((a, b) => a - b));
        expect(await own.summaries()).toEqual(summaries);
        expect(await seen()).toEqual(before);
        const thinned = await thinnedWithin(connection.db, { ...channel, ...allTime });
        expect(thinned.reduce((sum, stretch) => sum + stretch.samples, 0)).toBe(wanted);
        expect((await takeUntold(connection.db, channel))?.samples ?? 0).toBe(wanted);
        expect(await takeUntold(connection.db, channel)).toBeNull();
      },
    ),
    { numRuns: 40 },
  );
});

test('a plot of few samples shows the least and the greatest of each 2 s where the samples are gone', async () => {
  const samples = even(1, 0.5);
  const { connection, channel, thin } = await freshChannel(samples);
  const window = { fromUtcMs: eveningUtcMs + 600_000, toUtcMs: eveningUtcMs + 610_000 - 0.001 };
  await thin(eveningUtcMs + 10 * hourMs);
  const plot = await extremesOf(connection, { ...channel, ...window }, { cells: 100, total: 20 });
  const inside = samples.filter(({ ms }) => ms >= window.fromUtcMs && ms <= window.toUtcMs);
  expect(plot.value).toContain(Math.max(...inside.map(({ value }) => value)));
  expect(plot.value).toContain(Math.min(...inside.map(({ value }) => value)));
  // Four samples in each 2 s, of which two stand out.
  expect(plot.utcMs).toHaveLength(10);
});

test('a window that begins or ends within 2 s whose samples are gone counts those whole', async () => {
  const { connection, channel, thin } = await freshChannel(even(1, 0.5));
  await thin(eveningUtcMs + 10 * hourMs);
  const sums = await sumsOf(connection, channel, [
    { fromUtcMs: eveningUtcMs + 1001, toUtcMs: eveningUtcMs + 4500 },
    { fromUtcMs: eveningUtcMs + 700, toUtcMs: eveningUtcMs + 800 },
  ]);
  expect(sums.map(({ count }) => count)).toEqual([12, 4]);
});

test('nothing of a run that goes on, or that has not begun, goes', async () => {
  const own = await freshChannel(even(6, 10));
  await makeRun(own.connection.db, runStart(own.channel.labId, own.channel.rigId));
  // It was asked for at the evening's first instant.
  expect(await own.thin(eveningUtcMs + 100 * hourMs)).toBe(0);
  expect(await wouldGo(own.connection, own.channel, eveningUtcMs + 100 * hourMs)).toMatchObject({ samples: 0, kept: 2160 });
});

test('samples whose summaries do not count them stay: the step is undone as a whole', async () => {
  const own = await freshChannel(even(1, 1));
  await own.connection.pool.query('update sample_summaries set count = count - 1 where channel_id = $1 and level = 0 and at = $2', [
    own.channel.channelId,
    new Date(eveningUtcMs + 60_000),
  ]);
  await expect(own.thin(eveningUtcMs + 10 * hourMs)).rejects.toThrow(UnsoundSummariesError);
  expect(await own.left()).toHaveLength(3600);
  expect(await thinnedWithin(own.connection.db, { ...own.channel, ...allTime })).toEqual([]);
});

test('nothing is added where summaries alone are left, neither one sample nor among others; beside it all goes in', async () => {
  const own = await freshChannel(even(2, 1));
  const cutoff = eveningUtcMs + hourMs;
  await own.thin(cutoff);
  const summaries = await own.summaries();
  const beside = [{ ms: cutoff + 500, value: 3 }, ...even(0.5, 1).map(({ ms, value }) => ({ ms: ms + 3 * hourMs, value }))];
  for (const late of [
    [{ ms: eveningUtcMs + 5500, value: 1 }],
    [{ ms: eveningUtcMs, value: 0 }],
    [...beside, { ms: cutoff - 1, value: 1 }],
    even(3, 0.5).map(({ ms, value }) => ({ ms: ms + 250, value })),
  ]) {
    const refused = (await own.append(late).catch((error: unknown) => error)) as ThinnedSamplesError;
    expect(refused).toBeInstanceOf(ThinnedSamplesError);
    expect(refused).toMatchObject({ channelId: own.channel.channelId, fromUtcMs: eveningUtcMs, toUtcMs: cutoff });
  }
  expect(await own.left()).toHaveLength(3600);
  expect(await own.summaries()).toEqual(summaries);
  expect(await own.append(beside)).toEqual({ stored: beside.length, known: 0 });
});

test('of a channel that was thinned to its end the last instant is still known', async () => {
  const own = await freshChannel(even(1, 5));
  const last = await lastSampleOf(own.connection, own.channel);
  await own.thin(eveningUtcMs + 10 * hourMs);
  expect(await own.left()).toEqual([]);
  expect(await lastSampleOf(own.connection, own.channel)).toEqual(last);
});

test('what follows day by day joins what was thinned before', async () => {
  const own = await freshChannel(even(6, 2));
  for (const hour of [2, 3, 4]) await own.thin(eveningUtcMs + hour * hourMs, { atOnce: 100 });
  const { rows } = await own.connection.pool.query('select samples::int from thinned_stretches where channel_id = $1', [
    own.channel.channelId,
  ]);
  expect(rows).toEqual([{ samples: 7200 }]);
});
