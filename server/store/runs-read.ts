import { and, asc, desc, eq, gt, inArray, isNull, lt, notInArray, or } from 'drizzle-orm';
import { channels, runEvents, runs, runSteps } from '@/db/schema';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import type { ChannelRecord } from './imports';
import type { RehearsalRecords } from '../interfaces/heavy-tasks';
import type { Connection, Database, Handle } from './database';
import { createRunStore, endedStates } from './run-store';
import { lastSampleUtcMs } from './sample-summaries';

const summaryColumns = {
  labId: runs.labId,
  id: runs.id,
  rigId: runs.rigId,
  rigRevision: runs.rigRevision,
  protocolId: runs.protocolId,
  massSetId: runs.massSetId,
  rehearsal: runs.rehearsal,
  rigName: runs.rigName,
  protocolName: runs.protocolName,
  protocolRevision: runs.protocolRevision,
  massSetLabel: runs.massSetLabel,
  operator: runs.operator,
  startedById: runs.startedById,
  lastSeq: runs.lastSeq,
  state: runs.state,
  outcome: runs.outcome,
  failure: runs.failure,
  createdAt: runs.createdAt,
  startedAt: runs.startedAt,
  endedAt: runs.endedAt,
  predictedEndAt: runs.predictedEndAt,
};

/** What lists show of a run. */
export type RunListRow = Omit<RunRecord, 'start' | 'snapshot' | 'chartVersion' | 'lastHash'>;
export type RunRecord = typeof runs.$inferSelect;

export interface RunListQuery {
  labId: string;
  rigId?: string | undefined;
  activeOnly: boolean;
  /** Rows after this one in the order of the list. */
  after: { createdAt: number; id: string } | null;
  limit: number;
}

/** Runs and rehearsals, newest first. */
export function listRuns(db: Handle, query: RunListQuery): Promise<RunListRow[]> {
  const { after } = query;
  return db
    .select(summaryColumns)
    .from(runs)
    .where(
      and(
        eq(runs.labId, query.labId),
        query.rigId === undefined ? undefined : eq(runs.rigId, query.rigId),
        query.activeOnly ? notInArray(runs.state, endedStates) : undefined,
        after === null
          ? undefined
          : or(lt(runs.createdAt, after.createdAt), and(eq(runs.createdAt, after.createdAt), lt(runs.id, after.id))),
      ),
    )
    .orderBy(desc(runs.createdAt), desc(runs.id))
    .limit(query.limit);
}

export async function findRun(db: Handle, labId: string, runId: string): Promise<RunRecord | null> {
  const [found] = await db
    .select()
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.id, runId)));
  return found ?? null;
}

/** The run of each rig that has not ended, by rig. Rehearsals are no runs of the rig. */
export async function activeRuns(db: Handle, labId: string): Promise<Map<string, RunListRow>> {
  const rows = await db
    .select(summaryColumns)
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.rehearsal, false), notInArray(runs.state, endedStates)));
  return new Map(rows.map((row) => [row.rigId, row]));
}

/** What the engine has kept of the newest runs on a rig, newest first: those that count when one of them met the home edge. */
export function newestSnapshots(
  db: Handle,
  { labId, rigId }: { labId: string; rigId: string },
): Promise<Pick<RunRecord, 'id' | 'start' | 'snapshot' | 'chartVersion'>[]> {
  return db
    .select({ id: runs.id, start: runs.start, snapshot: runs.snapshot, chartVersion: runs.chartVersion })
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.rigId, rigId), eq(runs.rehearsal, false)))
    .orderBy(desc(runs.createdAt))
    .limit(snapshotsSearched);
}

const snapshotsSearched = 5;

/** The step log of a run in order, or those rows of it that are asked for. */
export async function readSteps(db: Handle, run: { labId: string; runId: string }, seqs?: readonly number[]): Promise<StepRow[]> {
  const ofRun = and(eq(runSteps.labId, run.labId), eq(runSteps.runId, run.runId));
  const rows = await db
    .select()
    .from(runSteps)
    .where(seqs === undefined ? ofRun : and(ofRun, inArray(runSteps.seq, [...seqs])))
    .orderBy(asc(runSteps.seq));
  return rows.map(({ labId: _lab, runId: _run, ...step }) => step);
}

/** Events of a run after `afterSeq`, oldest first. */
export async function readEvents(
  db: Handle,
  run: { labId: string; runId: string },
  page: { afterSeq: number; limit?: number; kind?: string | undefined },
): Promise<ChainedEvent[]> {
  const ofKind = page.kind === undefined ? undefined : eq(runEvents.kind, page.kind);
  const rows = await db
    .select()
    .from(runEvents)
    .where(and(eq(runEvents.labId, run.labId), eq(runEvents.runId, run.runId), gt(runEvents.seq, page.afterSeq), ofKind))
    .orderBy(asc(runEvents.seq))
    .limit(page.limit ?? 1_000_000);
  return rows.map(({ labId: _lab, runId: _run, ...event }) => event);
}

/** Channels whose samples belong to a run: its own, and for a run on the rig those of the rig. */
export function channelsOfRun(db: Handle, run: { labId: string; id: string; rigId: string; rehearsal: boolean }): Promise<ChannelRecord[]> {
  const own = eq(channels.runId, run.id);
  const ofRig = and(eq(channels.rigId, run.rigId), isNull(channels.runId));
  return db
    .select()
    .from(channels)
    .where(and(eq(channels.labId, run.labId), run.rehearsal ? own : or(own, ofRig)))
    .orderBy(asc(channels.createdAt), asc(channels.name));
}

export interface SampleFlow {
  /** The first and the last instant since the given one at which there is a sample; the last may lie before it. */
  firstUtcMs: number | null;
  lastUtcMs: number | null;
  /** Between two samples one after the other since then; null with fewer than two. */
  longestGapMs: number | null;
}

/** How a channel has been filled since an instant. */
export async function sampleFlow(
  connection: Connection,
  channel: { labId: string; channelId: string },
  sinceUtcMs: number,
): Promise<SampleFlow> {
  const result = await connection.pool.query<SampleFlow>(
    `with recent as (select at, at - lag(at) over (order by at) as gap from samples where lab_id = $1 and channel_id = $2 and at >= $3)
     select (extract(epoch from min(at)) * 1000)::double precision as "firstUtcMs",
       (extract(epoch from max(at)) * 1000)::double precision as "lastUtcMs",
       (extract(epoch from max(gap)) * 1000)::double precision as "longestGapMs"
     from recent`,
    [channel.labId, channel.channelId, new Date(sinceUtcMs)],
  );
  const recent = result.rows[0] ?? { firstUtcMs: null, lastUtcMs: null, longestGapMs: null };
  return recent.lastUtcMs === null ? { ...recent, lastUtcMs: await lastSampleUtcMs(connection, channel) } : recent;
}

/** The rig of a run that goes on; null where there is none, it is over, or it is a rehearsal. */
export async function rigOfRun(
  db: Handle,
  { labId, runId }: { labId: string; runId: string },
): Promise<{ labId: string; rigId: string } | null> {
  const [row] = await db
    .select({ labId: runs.labId, rigId: runs.rigId })
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.id, runId), eq(runs.rehearsal, false), notInArray(runs.state, endedStates)));
  return row ?? null;
}

/** Runs on rigs, of all labs, that have not ended. */
export const unfinishedRuns = (db: Handle): Promise<RunRecord[]> =>
  db
    .select()
    .from(runs)
    .where(and(eq(runs.rehearsal, false), notInArray(runs.state, endedStates)));

/** Ends a run that nothing can carry on, saying why. */
export async function markRunFailed(db: Handle, run: { labId: string; id: string }, end: { why: string; nowUtcMs: number }): Promise<void> {
  await db
    .update(runs)
    .set({ state: 'failed', outcome: 'failed', failure: end.why, endedAt: end.nowUtcMs })
    .where(and(eq(runs.labId, run.labId), eq(runs.id, run.id), notInArray(runs.state, endedStates)));
}

/** Stores what a rehearsal left, all or nothing. */
export async function storeRehearsal(db: Database, run: { labId: string; id: string }, records: RehearsalRecords): Promise<void> {
  const { outcome } = records;
  const summary = {
    state: outcome,
    outcome,
    startedAtUtcMs: records.startedAtUtcMs,
    endedAtUtcMs: records.endedAtUtcMs,
    predictedEndUtcMs: null,
    ...(records.reason === '' ? {} : { failure: records.reason }),
  };
  await createRunStore(db).commit({
    labId: run.labId,
    runId: run.id,
    expectedSeq: 0,
    snapshot: null,
    chartVersion: 0,
    steps: records.steps,
    events: records.events,
    summary,
  });
}
