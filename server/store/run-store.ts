import { and, asc, eq, exists, isNull, notInArray, sql } from 'drizzle-orm';
import { rigLeases, runEvents, runs, runSteps } from '@/db/schema';
import type { ChainHead } from '@/shared/archive/chain';
import type { ChainedEvent, RunStart, StepRow } from '@/shared/archive/run-records';
import type { RunState } from '@/shared/contracts/runs';
import { type LeftOpen, RigLostError, StaleRunError, type RunStore, type RunWrite, type StoredRun } from '../interfaces/run-store';
import type { Database, Handle, Transaction } from './database';

/** Rows of one INSERT: PostgreSQL takes at most 65 535 parameters a statement. */
const rowsAtOnce = 2000;
export const endedStates: RunState[] = ['finished', 'stopped', 'failed'];

export interface NewRun {
  start: RunStart;
  protocolId: string | null;
  massSetId: string | null;
  /** Account of the operator; null where nobody in particular started it. */
  startedById: string | null;
  state: RunState;
  nowUtcMs: number;
  predictedEndUtcMs: number | null;
}

/**
 * Adds a run before its first motion; a rehearsal is one with `start.simulated`.
 * @returns false when another run of the rig has not ended; nothing is written then
 */
export async function insertRun(db: Handle, run: NewRun): Promise<boolean> {
  const { start } = run;
  const rows = await db
    .insert(runs)
    .values({
      labId: start.labId,
      id: start.runId,
      rigId: start.rigId,
      rigRevision: start.rigRevision,
      protocolId: run.protocolId,
      massSetId: run.massSetId,
      startedById: run.startedById,
      rehearsal: start.simulated !== null,
      start,
      state: run.state,
      createdAt: run.nowUtcMs,
      predictedEndAt: run.predictedEndUtcMs,
      rigName: start.rigName,
      protocolName: start.protocolName,
      protocolRevision: start.protocolRevision,
      massSetLabel: start.massSetLabel,
      operator: start.operator,
    })
    .onConflictDoNothing({ target: [runs.labId, runs.rigId], where: oneRunPerRig })
    .returning({ id: runs.id });
  return rows.length === 1;
}

/** The condition of the partial unique index `runs_one_per_rig`. */
const oneRunPerRig = sql`not rehearsal and state not in ('finished', 'stopped', 'failed')`;

/**
 * Runs in PostgreSQL. One commit is one transaction; the chain's end in `runs` is the fence against a second writer. `holder`: of the leases
 * of the rigs whose runs are driven; without one, as for what a rehearsal left, nobody else can be driving.
 */
export function createRunStore(db: Database, holder: string | null = null): RunStore {
  return {
    load: async (labId, runId) => {
      const [row] = await db
        .select(storedColumns)
        .from(runs)
        .where(and(eq(runs.labId, labId), eq(runs.id, runId)));
      return row === undefined ? null : storedRunOf(row);
    },
    leftOpen: (labId, runId) => leftOpen(db, { labId, runId }),
    unfinished: async () => {
      const rows = await db
        .select(storedColumns)
        .from(runs)
        .where(and(eq(runs.rehearsal, false), notInArray(runs.state, endedStates)))
        .orderBy(asc(runs.createdAt));
      return rows.map(storedRunOf);
    },
    commit: (write) => db.transaction((tx) => commit(tx, write, holder)),
  };
}

async function leftOpen(db: Database, { labId, runId }: { labId: string; runId: string }): Promise<LeftOpen> {
  const [run] = await db
    .select({ startedAt: runs.startedAt })
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.id, runId)));
  const rows = await db
    .select()
    .from(runSteps)
    .where(and(eq(runSteps.labId, labId), eq(runSteps.runId, runId), isNull(runSteps.outcome)))
    .orderBy(asc(runSteps.seq));
  const steps = rows.map(({ labId: _lab, runId: _run, ...step }) => step);
  return { startedAtUtcMs: run?.startedAt ?? null, steps };
}

const storedColumns = {
  start: runs.start,
  snapshot: runs.snapshot,
  chartVersion: runs.chartVersion,
  lastSeq: runs.lastSeq,
  lastHash: runs.lastHash,
};

const storedRunOf = (row: { start: RunStart; snapshot: unknown; chartVersion: number; lastSeq: number; lastHash: string }): StoredRun => ({
  start: row.start,
  snapshot: row.snapshot,
  chartVersion: row.chartVersion,
  chain: { seq: row.lastSeq, hash: row.lastHash },
});

async function commit(tx: Transaction, write: RunWrite, holder: string | null): Promise<void> {
  const own = and(eq(runs.labId, write.labId), eq(runs.id, write.runId));
  const [row] = await tx.select({ lastSeq: runs.lastSeq, lastHash: runs.lastHash }).from(runs).where(own).for('update');
  if (row === undefined) throw new Error(`run ${write.runId} is not in the database: insert it before the first commit`);
  if (row.lastSeq !== write.expectedSeq) {
    throw new StaleRunError(
      `the chain of run ${write.runId} ends at ${row.lastSeq}, the writer believes ${write.expectedSeq}: somebody else drives this run`,
    );
  }
  const end = followChain({ seq: row.lastSeq, hash: row.lastHash }, write.events);
  await insertEvents(tx, write);
  await putSteps(tx, write);
  const { summary } = write;
  const updated = await tx
    .update(runs)
    .set({
      snapshot: write.snapshot,
      chartVersion: write.chartVersion,
      lastSeq: end.seq,
      lastHash: end.hash,
      state: summary.state as RunState,
      outcome: summary.outcome,
      startedAt: summary.startedAtUtcMs,
      endedAt: summary.endedAtUtcMs,
      predictedEndAt: summary.predictedEndUtcMs,
      ...(summary.failure === undefined ? {} : { failure: summary.failure }),
    })
    .where(holder === null ? own : and(own, leaseOf(tx, holder)))
    .returning({ id: runs.id });
  if (updated.length === 0)
    throw new RigLostError(`another process has the rig of run ${write.runId} by now, so nothing is written into the run here`);
}

/** Looked at in the last statement of a commit: a process that was frozen meanwhile does not write into a run that another took up. */
const leaseOf = (tx: Transaction, holder: string) =>
  exists(
    tx
      .select({ one: sql`1` })
      .from(rigLeases)
      .where(and(eq(rigLeases.labId, runs.labId), eq(rigLeases.rigId, runs.rigId), eq(rigLeases.holder, holder))),
  );

/** The end of the chain after `events`; a gap or a wrong `prev` is refused before anything is written. */
function followChain(from: ChainHead, events: readonly ChainedEvent[]): ChainHead {
  let end = from;
  for (const event of events) {
    if (event.seq !== end.seq + 1 || event.prev !== end.hash)
      throw new Error(`event ${event.seq} does not continue the chain, which ends at ${end.seq}`);
    end = { seq: event.seq, hash: event.hash };
  }
  return end;
}

async function insertEvents(tx: Transaction, write: RunWrite): Promise<void> {
  const own = { labId: write.labId, runId: write.runId };
  for (const part of partsOf(write.events)) await tx.insert(runEvents).values(part.map((event) => ({ ...own, ...event })));
}

async function putSteps(tx: Transaction, write: RunWrite): Promise<void> {
  const own = { labId: write.labId, runId: write.runId };
  const lastOfEach = [...new Map(write.steps.map((step) => [step.seq, step])).values()];
  for (const part of partsOf(lastOfEach)) {
    await tx
      .insert(runSteps)
      .values(part.map((step) => ({ ...own, ...step })))
      .onConflictDoUpdate({ target: [runSteps.labId, runSteps.runId, runSteps.seq], set: replacedByNew });
  }
}

const excluded = (column: string) => sql.raw(`excluded.${column}`);
const stepColumns = {
  path: 'path',
  kind: 'kind',
  label: 'label',
  station: 'station',
  plannedStartUtcMs: 'planned_start',
  plannedEndUtcMs: 'planned_end',
  startUtcMs: 'started_at',
  endUtcMs: 'ended_at',
  uStartS: 'u_start_s',
  uEndS: 'u_end_s',
  angleStartDeg: 'angle_start_deg',
  angleEndDeg: 'angle_end_deg',
  outcome: 'outcome',
  angleSource: 'angle_source',
  uAngleDeg: 'u_angle_deg',
  good: 'good',
} satisfies Record<Exclude<keyof StepRow, 'seq'>, string>;
const replacedByNew = Object.fromEntries(Object.entries(stepColumns).map(([field, column]) => [field, excluded(column)]));

function* partsOf<T>(rows: readonly T[]): Generator<T[]> {
  for (let from = 0; from < rows.length; from += rowsAtOnce) yield rows.slice(from, from + rowsAtOnce);
}
