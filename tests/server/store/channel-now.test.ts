import * as fc from 'fast-check';
import { extremesAbout, levelOfSlope, slopePerHOf, spanOf } from '@/server/store/channel-now';
import { createSampleStore } from '@/server/store/sample-store';
import { lastSampleOf } from '@/server/store/sample-summaries';
import { spacingOf } from '@/server/store/spacing';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeChannel, makeLab, makeRig } from './rows';

const database = databaseOfThisFile();

async function channelWith(samples: readonly { s: number; value: number }[]) {
  const { connection } = database();
  const lab = await makeLab(connection.db);
  const channel = { labId: lab.id, channelId: await makeChannel(connection.db, lab.id, await makeRig(connection.db, lab.id)) };
  await createSampleStore(connection).append(channel.labId, channel.channelId, {
    utcMs: Float64Array.from(samples, ({ s }) => eveningUtcMs + 1000 * s),
    value: Float64Array.from(samples, ({ value }) => value),
  });
  return { connection, channel };
}

/** Least-squares slope per hour by its textbook formula. */
function slopeOf(samples: readonly { s: number; value: number }[]): number {
  const n = samples.length;
  const [x, y] = [samples.reduce((sum, { s }) => sum + s, 0) / n, samples.reduce((sum, { value }) => sum + value, 0) / n];
  const [xy, xx] = [
    samples.reduce((sum, { s, value }) => sum + (s - x) * (value - y), 0),
    samples.reduce((sum, { s }) => sum + (s - x) ** 2, 0),
  ];
  return (3600 * xy) / xx;
}

/** A pressure that falls, with a swing on it, every half a second. */
const pressure = (seconds: number) =>
  Array.from({ length: 2 * seconds }, (_, k) => ({ s: k / 2, value: 101_325 - 0.004 * (k / 2) + Math.sin(k / 40) }));

test('the slope over a short window is that of its samples', async () => {
  const samples = pressure(100);
  const { connection, channel } = await channelWith(samples);
  const slope = await slopePerHOf(connection, channel, { utcMs: eveningUtcMs + 100_000, windowMs: 60_000 });
  expect(slope).toBeCloseTo(slopeOf(samples.filter(({ s }) => s >= 40)), 6);
});

test('the slope over a long window, from summaries, is that of its samples within 1 in 1000', async () => {
  const samples = pressure(3000);
  const { connection, channel } = await channelWith(samples);
  const slope = await slopePerHOf(connection, channel, { utcMs: eveningUtcMs + 3_000_000, windowMs: 2_400_000 });
  const wanted = slopeOf(samples.filter(({ s }) => s >= 600));
  expect(Math.abs((slope ?? NaN) / wanted - 1)).toBeLessThan(1e-3);
});

test('the span of a window is that of its samples to the last digit, and of an empty one none', async () => {
  const samples = pressure(3000);
  const { connection, channel } = await channelWith(samples);
  const inside = samples.filter(({ s }) => s >= 600).map(({ value }) => value);
  const window = { utcMs: eveningUtcMs + 3_000_000, windowMs: 2_400_000 };
  expect(await spanOf(connection, channel, window)).toBe(Math.max(...inside) - Math.min(...inside));
  expect(await spanOf(connection, channel, { utcMs: eveningUtcMs - 3_600_000, windowMs: 60_000 })).toBeNull();
});

test('two samples have no slope, and the greatest numbers none that breaks the look at them', async () => {
  const two = await channelWith([
    { s: 0, value: 1 },
    { s: 1, value: 2 },
  ]);
  expect(await slopePerHOf(two.connection, two.channel, { utcMs: eveningUtcMs + 2000, windowMs: 60_000 })).toBeNull();
  const wild = await channelWith([
    { s: 0, value: -1.7e308 },
    { s: 1, value: 5e-324 },
    { s: 2, value: 1.7e308 },
  ]);
  expect(await slopePerHOf(wild.connection, wild.channel, { utcMs: eveningUtcMs + 2000, windowMs: 60_000 })).toBe(Infinity);
});

test('a window of any length is asked as at most a few hundred buckets', () => {
  fc.assert(
    fc.property(fc.integer({ min: 128_000, max: 86_400_000 }), (windowMs) => {
      const level = levelOfSlope(windowMs) ?? -1;
      const buckets = windowMs / (2000 * 8 ** level);
      return buckets >= 64 && buckets <= 512;
    }),
  );
  expect(levelOfSlope(127_999)).toBeNull();
});

test('the last sample, and the extremes of what is recent about the mean of what was before', async () => {
  const samples = Array.from({ length: 500 }, (_, k) => ({ s: k, value: k === 100 ? 900 : k % 7 }));
  const { connection, channel } = await channelWith(samples);
  const utcMs = eveningUtcMs + 499_500;
  expect(await lastSampleOf(connection, channel)).toEqual({ utcMs: eveningUtcMs + 499_000, value: 499 % 7 });
  const about = await extremesAbout(connection, channel, { utcMs, windowMs: 499_500, recentMs: 100_000 });
  expect(about).toMatchObject({ least: 0, greatest: 6 });
  expect(about?.mean).toBeCloseTo(samples.reduce((sum, { value }) => sum + value, 0) / 500, 9);
  expect(await extremesAbout(connection, channel, { utcMs: utcMs + 1e9, windowMs: 1000, recentMs: 1000 })).toBeNull();
});

test('of many samples the longest gap and the usual spacing are those of all of them', async () => {
  const gaps = fc.record({ at: fc.integer({ min: 1, max: 599 }), s: fc.constantFrom(0.4, 3, 4.5, 31, 400) });
  await fc.assert(
    fc.asyncProperty(fc.uniqueArray(gaps, { minLength: 0, maxLength: 3, selector: ({ at }) => at }), async (found) => {
      let s = 7.3;
      const samples = Array.from({ length: 600 }, (_, k) => {
        s += 0.1 + (found.find(({ at }) => at === k)?.s ?? 0);
        return { s, value: k };
      });
      const { connection, channel } = await channelWith(samples);
      const window = { ...channel, fromUtcMs: eveningUtcMs + 7300, toUtcMs: eveningUtcMs + 1000 * s + 500 };
      const [each, many] = [await spacingOf(connection, window), await spacingOf(connection, window, 0)];
      expect(many.longestGapS).toBeCloseTo(each.longestGapS, 5);
      expect(many.usualS).toBeCloseTo(each.usualS ?? NaN, 5);
    }),
    { numRuns: 8 },
  );
});
