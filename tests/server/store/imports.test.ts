import { eq } from 'drizzle-orm';
import { runs } from '@/db/schema';
import { endEvaluation, freezeEvaluation, queueEvaluation } from '@/server/store/evaluations';
import { beginImport, ConflictingSamplesError, findOrMakeChannel, FrozenSamplesError, storeImport } from '@/server/store/imports';
import { createSampleStore } from '@/server/store/sample-store';
import { countSamples, sumsOf } from '@/server/store/sample-summaries';
import type { ImportMapping, SameInstant } from '@/shared/contracts/data';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeRun, runStart } from './rows';

const database = databaseOfThisFile();
const mapping: ImportMapping = {
  ...{ delimiter: ',', decimal: '.', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1 },
  unit: 'rad',
};

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
  return {
    /** Brings the same ten in again, the fourth as 99, and an eleventh. */
    bring: async (sameInstant: SameInstant) => {
      const by = { labId: lab.id, runId: start.runId, createdAt: eveningUtcMs, createdBy: 'Tam' };
      const file = await beginImport(db, { ...by, fileName: 'night.csv' });
      const work = { labId: lab.id, importId: file.id, channel: wanted, storedAt: eveningUtcMs, mapping, window, sameInstant };
      const [at, value] = [Float64Array.of(...utcMs, eveningUtcMs + 10_000), Float64Array.of(0, 1, 2, 99, 4, 5, 6, 7, 8, 9, 10)];
      const { stored, known, other } = await storeImport(connection, work, (take) => take({ utcMs: at, value }));
      return { stored, known, other };
    },
    freeze: async () => {
      const job = { labId: lab.id, runId: start.runId, channel: 'readout', createdAt: eveningUtcMs, createdBy: 'Tam' };
      const { id } = await db.transaction((tx) => queueEvaluation(tx, job));
      const key = { labId: lab.id, evaluationId: id };
      const end = { result: {} as EvaluationResult, curves: [], basis: null, channel: 'readout', software: '0', finishedAt: eveningUtcMs };
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
  await expect(night.bring('refuse')).rejects.toThrow(ConflictingSamplesError);
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
});

test('it leaves what is stored, or replaces it with the summaries, and new samples come in either way', async () => {
  const night = await nightWithSamples();
  expect(await night.bring('keep')).toEqual({ stored: 1, known: 10, other: 1 });
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10]);
  expect(await night.bring('replace')).toEqual({ stored: 0, known: 11, other: 1 });
  expect(await night.values()).toEqual([0, 1, 2, 99, 4, 5, 6, 7, 8, 9, 10]);
  expect([await night.count(), await night.greatest()]).toEqual([11, 99]);
});

test('what a frozen evaluation stands on is not replaced, and nothing of the file is stored', async () => {
  const night = await nightWithSamples();
  await night.freeze();
  await expect(night.bring('replace')).rejects.toThrow(FrozenSamplesError);
  expect(await night.values()).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8, 9]);
  expect(await night.bring('keep')).toEqual({ stored: 1, known: 10, other: 1 });
});
