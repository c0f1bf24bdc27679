import * as fc from 'fast-check';
import { createSampleStore, UnusableBatchError } from '@/server/store/sample-store';
import { decodeSamples, encodeSamples } from '@/server/store/sample-copy';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeChannel, makeLab, makeRig } from './rows';

const database = databaseOfThisFile();
const allTime = { fromUtcMs: -Infinity, toUtcMs: Infinity };

async function freshChannel() {
  const { connection } = database();
  const lab = await makeLab(connection.db);
  const rigId = await makeRig(connection.db, lab.id);
  return { store: createSampleStore(connection), labId: lab.id, channelId: await makeChannel(connection.db, lab.id, rigId) };
}

/** 10 Hz with an odd number of microseconds, values that no decimal writes exactly. */
const batchOf = (count: number, fromUtcMs = eveningUtcMs): SampleBatch => ({
  utcMs: Float64Array.from({ length: count }, (_, index) => fromUtcMs + index * 100 + 0.457),
  value: Float64Array.from({ length: count }, (_, index) => Math.sin(index / 7) / 3e5),
});

describe.each([
  ['a few samples', 25],
  ['many samples, by COPY', 5000],
])('%s', (_name, count) => {
  test('come back to the bit, with their microseconds', async () => {
    const { store, labId, channelId } = await freshChannel();
    const batch = batchOf(count);
    expect(await store.append(labId, channelId, batch)).toEqual({ stored: count, known: 0 });
    const back = await store.read(labId, channelId, allTime);
    expect(back.value).toEqual(batch.value);
    expect(Math.max(...back.utcMs.map((at, index) => Math.abs(at - (batch.utcMs[index] as number))))).toBeLessThan(0.0005);
  });

  test('sent again are known and stored once; only the new ones are added', async () => {
    const { store, labId, channelId } = await freshChannel();
    await store.append(labId, channelId, batchOf(count));
    expect(await store.append(labId, channelId, batchOf(count))).toEqual({ stored: 0, known: count });
    expect(await store.append(labId, channelId, batchOf(count + 10))).toEqual({ stored: 10, known: count });
    expect((await store.read(labId, channelId, allTime)).value.length).toBe(count + 10);
  });

  test('with one that is not finite are refused whole, naming it', async () => {
    const { store, labId, channelId } = await freshChannel();
    const batch = batchOf(count);
    batch.value[count - 2] = Number.NaN;
    await expect(store.append(labId, channelId, batch)).rejects.toThrow(`sample ${count - 1} of the batch`);
    expect((await store.read(labId, channelId, allTime)).value.length).toBe(0);
  });
});

test.each([
  ['a few samples', 2],
  ['many samples, by COPY', 5000],
])('of the same instant twice within one batch the first counts: %s', async (_name, count) => {
  const { store, labId, channelId } = await freshChannel();
  const batch = batchOf(count);
  batch.utcMs[1] = batch.utcMs[0] as number;
  expect(await store.append(labId, channelId, batch)).toEqual({ stored: count - 1, known: 1 });
  expect((await store.read(labId, channelId, allTime)).value[0]).toBe(batch.value[0]);
});

test('two who store the same at once store it once', async () => {
  const { store, labId, channelId } = await freshChannel();
  const batch = batchOf(5000);
  const done = await Promise.all([1, 2, 3].map(() => store.append(labId, channelId, batch)));
  expect(done.reduce((sum, { stored }) => sum + stored, 0)).toBe(5000);
  expect((await store.read(labId, channelId, allTime)).value).toEqual(batch.value);
});

test('pages hold every sample of a window once, in order, whatever their number', async () => {
  const { store, labId, channelId } = await freshChannel();
  await store.append(labId, channelId, batchOf(10_001));
  const [pages, all] = [[] as SampleBatch[], await store.read(labId, channelId, allTime)];
  for await (const page of store.pages(labId, channelId, allTime)) pages.push(page);
  expect(pages.length).toBeGreaterThan(2);
  expect(pages.flatMap(({ utcMs }) => [...utcMs])).toEqual([...all.utcMs]);
  expect(pages.flatMap(({ value }) => [...value])).toEqual([...all.value]);
  const window = { fromUtcMs: all.utcMs[10] as number, toUtcMs: all.utcMs[5009] as number };
  const inside: SampleBatch[] = [];
  for await (const page of store.pages(labId, channelId, window)) inside.push(page);
  expect(inside.flatMap(({ value }) => [...value])).toEqual([...all.value.slice(10, 5010)]);
});

test('a window takes both of its ends', async () => {
  const { store, labId, channelId } = await freshChannel();
  const batch = batchOf(10);
  await store.append(labId, channelId, batch);
  const back = await store.read(labId, channelId, { fromUtcMs: batch.utcMs[2] as number, toUtcMs: batch.utcMs[6] as number });
  expect(back.value).toEqual(batch.value.slice(2, 7));
});

test('a channel of another lab takes nothing and shows nothing', async () => {
  const mine = await freshChannel();
  const other = await freshChannel();
  await expect(mine.store.append(mine.labId, other.channelId, batchOf(3))).rejects.toThrow(UnusableBatchError);
  await other.store.append(other.labId, other.channelId, batchOf(3));
  expect((await mine.store.read(mine.labId, other.channelId, allTime)).value.length).toBe(0);
  expect((await mine.store.read(mine.labId, "x' or true --", allTime)).value.length).toBe(0);
});

test('unequal lengths are refused', async () => {
  const { store, labId, channelId } = await freshChannel();
  await expect(store.append(labId, channelId, { utcMs: Float64Array.of(1, 2), value: Float64Array.of(1) })).rejects.toThrow(
    '2 instants came with 1 values',
  );
});

test('the COPY format holds any whole microsecond from 1850 to 2090 and any double, however the stream is cut', async () => {
  // Beyond these years a double of milliseconds is coarser than half a microsecond.
  const us = fc.integer({ min: Date.UTC(1850, 0, 1) * 1000, max: Date.UTC(2090, 0, 1) * 1000 });
  const sample = fc.record({ us, value: fc.double() });
  await fc.assert(
    fc.asyncProperty(fc.array(sample, { maxLength: 40 }), fc.integer({ min: 1, max: 40 }), async (samples, cutBytes) => {
      const whole = Buffer.concat([
        ...encodeSamples({ utcMs: Float64Array.from(samples, (s) => s.us / 1000), value: Float64Array.from(samples, (s) => s.value) }),
      ]);
      const cut = async function* () {
        for (let at = 0; at < whole.length; at += cutBytes) yield whole.subarray(at, at + cutBytes);
      };
      const back = await decodeSamples(cut());
      expect(Array.from(back.utcMs, (at) => Math.round(at * 1000))).toEqual(samples.map((s) => s.us));
      expect(Array.from(back.value)).toEqual(samples.map((s) => s.value));
    }),
  );
});
