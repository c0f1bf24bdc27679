import { eq } from 'drizzle-orm';
import { runs } from '@/db/schema';
import { endEvaluation, queueEvaluation } from '@/server/store/evaluations';
import { nightsBefore, rangeAndMeans } from '@/server/store/nights';
import { createSampleStore } from '@/server/store/sample-store';
import { spacingOf } from '@/server/store/spacing';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeChannel, makeLab, makeRig, makeRun, runStart } from './rows';

const database = databaseOfThisFile();
const minute = 60_000;

test('the spacing of samples counts the ends of the window; the range and the means of spans are those of the samples within', async () => {
  const { connection } = database();
  const lab = await makeLab(connection.db);
  const channelId = await makeChannel(connection.db, lab.id, await makeRig(connection.db, lab.id));
  const window = { labId: lab.id, channelId, fromUtcMs: eveningUtcMs, toUtcMs: eveningUtcMs + 10 * minute };
  expect(await spacingOf(connection, window)).toEqual({ longestGapS: 600, usualS: null });
  expect(await rangeAndMeans(connection, window, [])).toBeNull();
  // One a second for four minutes, from the second minute on, a gap of 90 s in it: 2 min before and 2 min 30 s after are without.
  const seconds = Array.from({ length: 241 }, (_, k) => 120 + k + (k > 100 ? 89 : 0));
  const utcMs = Float64Array.from(seconds, (s) => eveningUtcMs + 1000 * s);
  await createSampleStore(connection).append(lab.id, channelId, { utcMs, value: Float64Array.from(seconds) });
  expect(await spacingOf(connection, window)).toEqual({ longestGapS: 151, usualS: 1 });
  const spans = [
    { seq: 3, fromUtcMs: eveningUtcMs + 2 * minute, toUtcMs: eveningUtcMs + 3 * minute },
    { seq: 5, fromUtcMs: eveningUtcMs, toUtcMs: eveningUtcMs + minute },
  ];
  const found = await rangeAndMeans(connection, window, spans);
  expect(found).toMatchObject({ least: 120, greatest: 449 });
  expect([...(found?.means ?? [])]).toEqual([[3, 150]]);
});

test('earlier nights are those of the rig that were evaluated, by their newest evaluation, the newest first', async () => {
  const { connection } = database();
  const { db } = connection;
  const lab = await makeLab(db);
  const rigId = await makeRig(db, lab.id);
  const night = async (day: number, values: readonly number[], changes: { rehearsal?: boolean; control?: boolean } = {}) => {
    const rig = changes.control === true ? { ...demoRigWide, sources: { shape: 'none' as const } } : demoRigWide;
    const start = runStart(lab.id, rigId, { rig });
    await makeRun(db, start);
    const at = { startedAt: eveningUtcMs + day * 86_400_000, endedAt: eveningUtcMs + day * 86_400_000 + minute };
    await db
      .update(runs)
      .set({ ...at, state: 'finished', rehearsal: changes.rehearsal ?? false })
      .where(eq(runs.id, start.runId));
    for (const [index, value] of values.entries()) {
      const createdAt = at.endedAt + index;
      const job = { labId: lab.id, runId: start.runId, channel: 'deflection', clock: null, createdAt, createdBy: 'Tam' };
      const { id } = await db.transaction((tx) => queueEvaluation(tx, job));
      const result = { reversal_rad: { value, u: 1e-6, count: 3 }, period_s: null, decayTime_s: null, kappa_N_m: null } as EvaluationResult;
      const end = { result, curves: [], basis: null, channel: 'deflection', software: '0', finishedAt: createdAt };
      await endEvaluation(db, { labId: lab.id, evaluationId: id }, end);
    }
    return start.runId;
  };
  const first = await night(0, [1e-3, 2e-3]);
  const control = await night(1, [0], { control: true });
  await night(2, []);
  await night(3, [9e-3], { rehearsal: true });
  await night(5, [7e-3]);
  const found = await nightsBefore(connection, { labId: lab.id, rigId, massSetId: null, startedAtUtcMs: eveningUtcMs + 4 * 86_400_000 });
  expect(found.map(({ runId, control: empty, reversal_rad }) => [runId, empty, reversal_rad.value])).toEqual([
    [control, true, 0],
    [first, false, 2e-3],
  ]);
  expect(found[1]).toMatchObject({ startedAt: '2031-05-06T20:00:00.000Z', reversal_rad: { u: 1e-6 }, period_s: null });
});
