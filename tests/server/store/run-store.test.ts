import { asc, eq } from 'drizzle-orm';
import { connect } from '@/db/connect';
import { runEvents, runSteps } from '@/db/schema';
import { RigLostError, StaleRunError, type RunWrite } from '@/server/interfaces/run-store';
import { isPassing } from '@/server/store/failures';
import { takeRigLease, type Takeable } from '@/server/store/rig-leases';
import { createRunStore } from '@/server/store/run-store';
import { appendEvent, emptyChain, verifyChain, type ChainHead } from '@/shared/archive/chain';
import type { ChainedEvent, RunStart, StepRow } from '@/shared/archive/run-records';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeRun, runStart, sha256 } from './rows';

const database = databaseOfThisFile();
const db = () => database().connection.db;

async function freshRun(changes: Partial<RunStart> = {}) {
  const lab = await makeLab(db());
  const rigId = await makeRig(db(), lab.id);
  const start = runStart(lab.id, rigId, changes);
  expect(await makeRun(db(), start)).toBe(true);
  return start;
}

const event = (head: ChainHead, data: Record<string, unknown> = {}) =>
  appendEvent(head, { at: '2031-05-06T20:00:00.123Z', kind: 'step-began', data }, sha256);

const step = (seq: number, changes: Partial<StepRow> = {}): StepRow => ({
  seq,
  path: `${seq}.swing`,
  kind: 'swing',
  label: '',
  station: 'near',
  plannedStartUtcMs: eveningUtcMs,
  plannedEndUtcMs: null,
  startUtcMs: eveningUtcMs + 0.125,
  endUtcMs: null,
  uStartS: 0.0002,
  uEndS: null,
  angleStartDeg: 0,
  angleEndDeg: null,
  outcome: null,
  angleSource: 'counted',
  uAngleDeg: 0.01,
  good: null,
  ...changes,
});

const write = (start: RunStart, changes: Partial<RunWrite> = {}): RunWrite => ({
  labId: start.labId,
  runId: start.runId,
  expectedSeq: 0,
  snapshot: { value: 'running' },
  chartVersion: 1,
  steps: [],
  events: [],
  summary: {
    state: 'running',
    outcome: null,
    startedAtUtcMs: eveningUtcMs,
    endedAtUtcMs: null,
    predictedEndUtcMs: eveningUtcMs + 3_600_000,
  },
  ...changes,
});

test('a commit keeps snapshot, steps, events and summary, and load gives them back', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const first = event(emptyChain, { garbage: 'a\u0000b\ud800', angleDeg: 20.18, tiny: 1e-300 });
  await store.commit(write(start, { events: [first], steps: [step(1)], snapshot: { deadline: eveningUtcMs + 0.25, garbage: '\u0000' } }));

  const loaded = await store.load(start.labId, start.runId);
  expect(loaded).toEqual({
    start,
    snapshot: { deadline: eveningUtcMs + 0.25, garbage: '\u0000' },
    chartVersion: 1,
    chain: { seq: 1, hash: first.hash },
  });
  const [row] = await db().select().from(runSteps).where(eq(runSteps.runId, start.runId));
  expect(row).toMatchObject(step(1));
});

test('the stored chain verifies, odd characters of a noisy line included', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const chain: ChainedEvent[] = [];
  for (const text of ['plain', 'nul \u0000', 'lone \udfff', 'ü µ − ×10⁻¹¹'])
    chain.push(event(chain.at(-1) ?? emptyChain, { text, values: [0.1, -0, 1e21, 5e-324] }));
  await store.commit(write(start, { events: chain }));
  const rows = await db().select().from(runEvents).where(eq(runEvents.runId, start.runId)).orderBy(asc(runEvents.seq));
  expect(
    verifyChain(
      rows.map(({ labId: _lab, runId: _run, ...link }) => link),
      sha256,
    ),
  ).toMatchObject({ valid: true, events: 4 });
});

test('a step row with a known seq replaces the earlier one', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  await store.commit(write(start, { steps: [step(1)] }));
  await store.commit(
    write(start, { steps: [step(1, { outcome: 'done', endUtcMs: eveningUtcMs + 5000.001, angleEndDeg: 20.179 }), step(2)] }),
  );
  const rows = await db().select().from(runSteps).where(eq(runSteps.runId, start.runId)).orderBy(asc(runSteps.seq));
  expect(rows.map((row) => [row.seq, row.outcome, row.endUtcMs])).toEqual([
    [1, 'done', eveningUtcMs + 5000.001],
    [2, null, null],
  ]);
});

test('a writer that does not know the end of the chain is refused and writes nothing', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const first = event(emptyChain);
  await store.commit(write(start, { events: [first] }));
  await expect(store.commit(write(start, { expectedSeq: 0, events: [event(emptyChain)], steps: [step(9)] }))).rejects.toThrow(
    StaleRunError,
  );
  expect(await db().select().from(runSteps).where(eq(runSteps.runId, start.runId))).toEqual([]);
  expect((await store.load(start.labId, start.runId))?.chain.seq).toBe(1);
});

test('a process whose rig another has taken over writes nothing more, however well it knows the end of the chain', async () => {
  const start = await freshRun();
  const { labId, rigId } = start;
  const take = (holder: string, why?: Takeable) => takeRigLease(db(), { labId, rigId, holder, leaseMs: 3000, why });
  const [frozen, next] = [createRunStore(db(), 'frozen'), createRunStore(db(), 'next')];
  const [first, late] = [event(emptyChain), event(event(emptyChain), { late: true })];

  expect(await take('frozen')).toBe(1);
  await frozen.commit(write(start, { events: [first] }));
  await expect(next.commit(write(start, { expectedSeq: 1, events: [late] }))).rejects.toThrow(RigLostError);
  expect(await take('next', { gone: 'frozen' })).toBe(2);
  await expect(frozen.commit(write(start, { expectedSeq: 1, events: [late], steps: [step(7)] }))).rejects.toThrow(
    'another process has the rig',
  );
  expect(await db().$count(runSteps, eq(runSteps.runId, start.runId))).toBe(0);
  expect((await next.load(labId, start.runId))?.chain).toEqual({ seq: 1, hash: first.hash });
  await next.commit(write(start, { expectedSeq: 1, events: [event(first)] }));
  await expect(frozen.commit(write(start, { expectedSeq: 1, events: [late] }))).rejects.toThrow(StaleRunError);
  expect((await next.load(labId, start.runId))?.chain.seq).toBe(2);
});

test('a process that was frozen in the middle of a commit keeps the run locked for no longer than its connection may idle', async () => {
  const start = await freshRun();
  const frozen = connect({ url: database().url, maxConnections: 1, idleInTransactionMs: 50 });
  const client = await frozen.pool.connect();
  await client.query(`begin; select 1 from runs where id = '${start.runId}' for update`);
  await createRunStore(db()).commit(write(start, { events: [event(emptyChain)] }));
  const woken = await client.query('commit').catch((error: unknown) => error);
  expect(isPassing(woken)).toBe(true);
  client.release(true);
  await frozen.close();
});

test('of two writers at once one wins', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const results = await Promise.allSettled([1, 2].map((n) => store.commit(write(start, { events: [event(emptyChain, { n })] }))));
  expect(results.map((result) => result.status).sort()).toEqual(['fulfilled', 'rejected']);
});

test('events that do not continue the chain are refused whole', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const first = event(emptyChain);
  await expect(store.commit(write(start, { events: [first, event({ seq: 5, hash: first.hash })] }))).rejects.toThrow(
    'event 6 does not continue the chain',
  );
  expect(await db().select().from(runEvents).where(eq(runEvents.runId, start.runId))).toEqual([]);
});

test('thousands of rows in one commit are stored', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const events: ChainedEvent[] = [];
  for (let n = 0; n < 4500; n += 1) events.push(event(events.at(-1) ?? emptyChain, { n }));
  await store.commit(write(start, { events, steps: Array.from({ length: 4100 }, (_, index) => step(index + 1)) }));
  expect((await store.load(start.labId, start.runId))?.chain.seq).toBe(4500);
  expect(await db().$count(runSteps, eq(runSteps.runId, start.runId))).toBe(4100);
}, 60_000);

test('a rig has one run at a time, and rehearsals beside it', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  expect(await makeRun(db(), runStart(start.labId, start.rigId))).toBe(false);
  const recipe = { trueG: 6.6743e-11, seed: 1, rateHz: 10, faults: [] };
  expect(await makeRun(db(), runStart(start.labId, start.rigId, { simulated: recipe }))).toBe(true);
  await store.commit(
    write(start, {
      summary: { state: 'stopped', outcome: 'stopped', startedAtUtcMs: eveningUtcMs, endedAtUtcMs: eveningUtcMs, predictedEndUtcMs: null },
    }),
  );
  expect(await makeRun(db(), runStart(start.labId, start.rigId))).toBe(true);
});

test('unfinished runs are found after a restart, ended ones and rehearsals are not', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const rehearsal = runStart(start.labId, start.rigId, { simulated: { trueG: 6.6743e-11, seed: 1, rateHz: 10, faults: [] } });
  await makeRun(db(), rehearsal);
  const ids = (await store.unfinished()).map((run) => run.start.runId);
  expect(ids).toContain(start.runId);
  expect(ids).not.toContain(rehearsal.runId);
  await store.commit(
    write(start, {
      summary: { state: 'failed', outcome: 'failed', startedAtUtcMs: null, endedAtUtcMs: eveningUtcMs, predictedEndUtcMs: null },
    }),
  );
  expect((await store.unfinished()).map((run) => run.start.runId)).not.toContain(start.runId);
});

test('another lab cannot load the run', async () => {
  const store = createRunStore(db());
  const start = await freshRun();
  const other = await makeLab(db(), 'Other');
  expect(await store.load(other.id, start.runId)).toBeNull();
});
