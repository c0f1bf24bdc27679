import { eq } from 'drizzle-orm';
import { runs } from '@/db/schema';
import { endEvaluation, freezeEvaluation, queueEvaluation } from '@/server/store/evaluations';
import { FrozenSamplesError, RowsAmongSamplesError, storeImport, StoredMeanwhileError, tryImport } from '@/server/store/import-commit';
import { beginImport } from '@/server/store/import-files';
import { ConflictingSamplesError, findOrMakeChannel } from '@/server/store/imports';
import type { Staging } from '@/server/store/import-staging';
import { createSampleStore } from '@/server/store/sample-store';
import { countSamples, sumsOf } from '@/server/store/sample-summaries';
import type { ImportChoices, ImportMapping } from '@/shared/contracts/data';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeRun, runStart } from './rows';

const database = databaseOfThisFile();
const mapping: ImportMapping = {
  ...{ delimiter: ',', decimal: '.', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1 },
  unit: 'rad',
};

const columns = ['time', 'angle'];

type Rows = [utcMs: number[], value: number[]];

async function staged(staging: Staging, utcMs: number[], value: number[]) {
  const row = Float64Array.from(utcMs, (_, index) => index + 2);
  await staging.take({ row, utcMs: Float64Array.from(utcMs), value: Float64Array.from(value) });
  return { usualS: 1, leftOut: 0 };
}

/** Rows from `from` on, one each `everyMs`, whose values are their numbers. */
const rowsFrom = (from: number, count: number, everyMs = 1000): Rows => [
  Array.from({ length: count }, (_, k) => from + everyMs * k),
  Array.from({ length: count }, (_, k) => k),
];

/** A run of an hour whose imported channel holds ten samples, one a second, of which sample 3 is 3. */
async function nightWithSamples() {
  const { connection } = database();
  const { db } = connection;
  const lab = await makeLab(db);
  const rigId = await makeRig(db, lab.id);
  const start = runStart(lab.id, rigId);
  await makeRun(db, start);
  await db
    .update(runs)
    .set({ startedAt: eveningUtcMs, endedAt: eveningUtcMs + 3_600_000, state: 'finished' })
    .where(eq(runs.id, start.runId));
  const wanted = {
    ...{ labId: lab.id, rigId, runId: null, name: 'readout', quantity: 'pendulum angle', unit: 'rad', createdAt: eveningUtcMs },
    ...{ role: 'deflection' as const, source: 'import' as const },
  };
  const channel = await findOrMakeChannel(db, wanted);
  const utcMs = Float64Array.from({ length: 10 }, (_, k) => eveningUtcMs + 1000 * k);
  const store = createSampleStore(connection);
  await store.append(lab.id, channel.id, { utcMs, value: utcMs.map((_, k) => k) });
  const window = { labId: lab.id, channelId: channel.id, fromUtcMs: eveningUtcMs, toUtcMs: eveningUtcMs + 60_000 };
  const again: Rows = [
    [...utcMs, eveningUtcMs + 10_000],
    [0, 1, 2, 99, 4, 5, 6, 7, 8, 9, 10],
  ];
  return {
    /** Brings the same ten in again, the fourth as 99, and an eleventh; or other rows. */
    bring: async (choices: Partial<ImportChoices>, [at, value] = again) => {
      const by = { labId: lab.id, runId: start.runId, createdAt: eveningUtcMs, createdBy: 'Tam' };
      const file = await beginImport(db, { ...by, fileName: 'night.csv' });
      const work = {
        ...{ labId: lab.id, importId: file.id, channel: wanted, storedAt: eveningUtcMs, mapping, columns, by: 'Tam', window },
        choices: { sameInstant: 'refuse' as const, among: 'refuse' as const, ...choices },
      };
      const { stored, known, other, leftOut } = await storeImport(connection, work, (staging) => staged(staging, at, value));
      await expect(storeImport(connection, work, (staging) => staged(staging, at, value))).rejects.toThrow(StoredMeanwhileError);
      return { stored, known, other, leftOut };
    },
    find: async ([at, value] = again) =>
      (
        await tryImport(connection, { channel: wanted, window: { fromUtcMs: at[1] as number, toUtcMs: at.at(-2) as number } }, (staging) =>
          staged(staging, at, value),
        )
      ).findings,
    freeze: async () => {
      const job = { labId: lab.id, runId: start.runId, channel: 'readout', clock: null, createdAt: eveningUtcMs, createdBy: 'Tam' };
      const { id } = await db.transaction((tx) => queueEvaluation(tx, job));
      const key = { labId: lab.id, evaluationId: id };
      const end = {
        result: {} as EvaluationResult,
        curves: [],
        basis: null,
        channel: 'readout',
        software: '0',
        finishedAt: eveningUtcMs,
      };
      await endEvaluation(db, key, end);
      await freezeEvaluation(db, { ...key, frozenAt: eveningUtcMs, frozenBy: 'Tam', frozenReason: 'published' });
    },
    values: async () => [...(await store.read(lab.id, channel.id, window)).value],
    count: () => countSamples(connection, window),
    greatest: async () => (await sumsOf(connection, window, [window]))[0]?.greatest,
  };
}

test('another value at a known instant stores nothing where that was chosen', async () => {
  const night = await nightWithSamples();
  await expect(night.bring({})).rejects.toThrow(ConflictingSamplesError);
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
});

test('it leaves what is stored, or replaces it with the summaries, and new samples come in either way', async () => {
  const night = await nightWithSamples();
  expect(await night.bring({ sameInstant: 'keep' })).toEqual({ stored: 1, known: 10, other: 1, leftOut: 0 });
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10]);
  expect(await night.bring({ sameInstant: 'replace' })).toEqual({ stored: 0, known: 11, other: 1, leftOut: 0 });
  expect(await night.values()).toEqual([0, 1, 2, 99, 4, 5, 6, 7, 8, 9, 10]);
  expect([await night.count(), await night.greatest()]).toEqual([11, 99]);
});

test('what a frozen evaluation stands on is not replaced, and nothing of the file is stored', async () => {
  const night = await nightWithSamples();
  await night.freeze();
  await expect(night.bring({ sameInstant: 'replace' })).rejects.toThrow(FrozenSamplesError);
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
  expect(await night.bring({ sameInstant: 'keep' })).toEqual({ stored: 1, known: 10, other: 1, leftOut: 0 });
});

test('the dry run tells what is new, equal and different, by row, and leaves all as it is', async () => {
  const night = await nightWithSamples();
  const found = await night.find();
  expect(found).toMatchObject({ held: 10, fresh: 1, equal: 9, different: 1, frozen: false, among: { rows: 0 }, gaps: { count: 0 } });
  expect(found.differing).toEqual([{ row: 5, at: new Date(eveningUtcMs + 3000).toISOString(), stored: 3, inFile: 99 }]);
  expect(found.outsideRun).toEqual({ before: 1, after: 1 });
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
  await night.freeze();
  expect((await night.find()).frozen).toBe(true);
});

test('rows among samples of other instants are refused, left out or stored beside them, as is chosen', async () => {
  const night = await nightWithSamples();
  // Half a second beside the samples, from the third before their end on, and five after it.
  const beside = rowsFrom(eveningUtcMs + 6500, 8);
  const found = await night.find(beside);
  expect(found).toMatchObject({ held: 3, fresh: 8, equal: 0, different: 0 });
  // At 6.5 s, 7.5 s and 8.5 s; the last sample is at 9 s.
  expect(found.among).toEqual({
    rows: 3,
    stretches: [{ fromAt: new Date(eveningUtcMs).toISOString(), toAt: new Date(eveningUtcMs + 9000).toISOString(), rows: 3, held: 10 }],
  });
  await expect(night.bring({}, beside)).rejects.toThrow(RowsAmongSamplesError);
  expect(await night.count()).toBe(10);
  expect(await night.bring({ among: 'leave-out' }, beside)).toEqual({ stored: 5, known: 0, other: 0, leftOut: 3 });
  expect(await night.count()).toBe(15);
  // Those that were left out before, and nothing else.
  expect(await night.bring({ among: 'both' }, beside)).toEqual({ stored: 3, known: 5, other: 0, leftOut: 0 });
  expect(await night.count()).toBe(18);
});

test('a finer record that holds the same values at the known instants is no second record', async () => {
  const night = await nightWithSamples();
  const finer: Rows = [rowsFrom(eveningUtcMs, 19, 500)[0], Array.from({ length: 19 }, (_, k) => k / 2)];
  expect((await night.find(finer)).among.rows).toBe(0);
  expect(await night.bring({}, finer)).toEqual({ stored: 9, known: 10, other: 0, leftOut: 0 });
});

test('gaps of the file are told with what the channel holds in them', async () => {
  const night = await nightWithSamples();
  const [before, after] = [rowsFrom(eveningUtcMs - 5000, 5)[0], rowsFrom(eveningUtcMs + 30_000, 5)[0]];
  const { gaps, held } = await night.find([[...before, ...after], Array.from({ length: 10 }, () => 0)]);
  expect(held).toBe(10);
  expect(gaps).toEqual({
    count: 1,
    totalS: 31,
    longest: [{ fromAt: new Date(eveningUtcMs - 1000).toISOString(), toAt: new Date(eveningUtcMs + 30_000).toISOString(), held: 10 }],
  });
});

/** What `summarise_samples` would make of all samples of the channel, against what stands there. */
test('the summaries of an import are those that are computed from its samples, over several batches and long gaps too', async () => {
  const { connection } = database();
  const lab = await makeLab(connection.db);
  const rigId = await makeRig(connection.db, lab.id);
  const start = runStart(lab.id, rigId);
  await makeRun(connection.db, start);
  const wanted = {
    ...{ labId: lab.id, rigId, runId: null, name: 'long', quantity: 'pendulum angle', unit: 'rad', createdAt: eveningUtcMs },
    ...{ role: 'deflection' as const, source: 'import' as const },
  };
  const file = await beginImport(connection.db, {
    labId: lab.id,
    runId: start.runId,
    createdAt: eveningUtcMs,
    createdBy: 'Tam',
    fileName: 'a',
  });
  const batches: Rows[] = [
    rowsFrom(eveningUtcMs + 300, 4000, 137),
    rowsFrom(eveningUtcMs + 300 + 4000 * 137, 4000, 700),
    rowsFrom(eveningUtcMs + 86_400_000 * 40, 500, 3_700_000),
  ];
  const work = {
    ...{ labId: lab.id, importId: file.id, channel: wanted, storedAt: eveningUtcMs, mapping, columns, by: 'Tam' },
    ...{
      window: { fromUtcMs: eveningUtcMs, toUtcMs: eveningUtcMs },
      choices: { sameInstant: 'refuse' as const, among: 'refuse' as const },
    },
  };
  const { channel, stored } = await storeImport(connection, work, async (staging) => {
    for (const [at, value] of batches)
      await staged(
        staging,
        at,
        value.map((k) => Math.sin(k)),
      );
    return { usualS: 1, leftOut: 0 };
  });
  expect(stored).toBe(8500);
  const summaries = async () =>
    (
      await connection.pool.query(
        'select level, at, count, least, least_at, greatest, greatest_at, round(mean::numeric, 12) as mean from sample_summaries where channel_id = $1 order by level, at',
        [channel.id],
      )
    ).rows;
  const made = await summaries();
  await connection.pool.query('delete from sample_summaries where channel_id = $1', [channel.id]);
  await connection.pool.query(
    `select summarise_buckets($1, $2, array(select distinct bucket_of('2 s', at) from samples where channel_id = $2))`,
    [lab.id, channel.id],
  );
  expect(made.length).toBeGreaterThan(1000);
  expect(made).toEqual(await summaries());
});
