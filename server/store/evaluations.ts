import { and, desc, eq, inArray, isNotNull, isNull } from 'drizzle-orm';
import { evaluations } from '@/db/schema';
import type { ClockChoice } from '@/shared/evaluation/clock-choice';
import type { EvaluationWork } from '../interfaces/heavy-tasks';
import { one, type Handle, type Transaction } from './database';
import { enqueueJob } from './jobs';

export type EvaluationRecord = typeof evaluations.$inferSelect;
/** Without what only the page of one evaluation shows. */
export type ListedRecord = Omit<EvaluationRecord, 'curves' | 'basis'>;

/** Kind of the jobs that evaluate a run; the payload is an {@link EvaluationJob}. */
export const evaluationJobKind = 'evaluate';

export interface EvaluationJob {
  labId: string;
  evaluationId: string;
}

export interface NewEvaluation {
  labId: string;
  runId: string;
  channel: string | null;
  clock: ClockChoice | null;
  createdAt: number;
  createdBy: string;
  /** The frozen evaluation that this one computes again. */
  recomputes?: string;
}

/** Adds an evaluation and the job that works it off, both or neither. */
export async function queueEvaluation(tx: Transaction, evaluation: NewEvaluation): Promise<EvaluationRecord> {
  const row = one(
    await tx
      .insert(evaluations)
      .values({ ...evaluation, state: 'queued' })
      .returning(),
  );
  const payload: EvaluationJob = { labId: row.labId, evaluationId: row.id };
  await enqueueJob(tx, { kind: evaluationJobKind, payload, labId: row.labId, nowUtcMs: evaluation.createdAt, maxAttempts: 3 });
  return row;
}

/** Evaluations of a run, newest first. */
export async function listEvaluations(db: Handle, labId: string, runId: string): Promise<ListedRecord[]> {
  return db
    .select(listColumns)
    .from(evaluations)
    .where(and(eq(evaluations.labId, labId), eq(evaluations.runId, runId)))
    .orderBy(desc(evaluations.createdAt), desc(evaluations.id));
}

const listColumns = {
  labId: evaluations.labId,
  id: evaluations.id,
  runId: evaluations.runId,
  state: evaluations.state,
  channel: evaluations.channel,
  clock: evaluations.clock,
  createdAt: evaluations.createdAt,
  createdBy: evaluations.createdBy,
  finishedAt: evaluations.finishedAt,
  error: evaluations.error,
  result: evaluations.result,
  software: evaluations.software,
  recomputes: evaluations.recomputes,
  frozenAt: evaluations.frozenAt,
  frozenBy: evaluations.frozenBy,
  frozenReason: evaluations.frozenReason,
};

export async function findEvaluation(db: Handle, labId: string, evaluationId: string): Promise<EvaluationRecord | null> {
  const [found] = await db
    .select()
    .from(evaluations)
    .where(and(eq(evaluations.labId, labId), eq(evaluations.id, evaluationId)));
  return found ?? null;
}

/** Marks an evaluation as being worked on; null where it is over already. */
export async function beginEvaluation(db: Handle, job: EvaluationJob): Promise<EvaluationRecord | null> {
  const open = inArray(evaluations.state, ['queued', 'running']);
  const [row] = await db
    .update(evaluations)
    .set({ state: 'running' })
    .where(and(eq(evaluations.labId, job.labId), eq(evaluations.id, job.evaluationId), open))
    .returning();
  return row ?? null;
}

export type EvaluationEnd = (EvaluationWork & { channel: string | null; software: string }) | { error: string };

export async function endEvaluation(db: Handle, job: EvaluationJob, end: EvaluationEnd & { finishedAt: number }): Promise<void> {
  const state = 'error' in end ? 'failed' : 'done';
  await db
    .update(evaluations)
    .set({ ...end, state })
    .where(and(eq(evaluations.labId, job.labId), eq(evaluations.id, job.evaluationId)));
}

/** Freezes an evaluation that came to a result, for good; null where it has none, is frozen already or computes another again. */
export async function freezeEvaluation(
  db: Handle,
  { labId, evaluationId, ...frozen }: EvaluationJob & { frozenAt: number; frozenBy: string; frozenReason: string },
): Promise<EvaluationRecord | null> {
  const open = and(eq(evaluations.state, 'done'), isNull(evaluations.frozenAt), isNull(evaluations.recomputes));
  const [row] = await db
    .update(evaluations)
    .set(frozen)
    .where(and(eq(evaluations.labId, labId), eq(evaluations.id, evaluationId), open))
    .returning();
  return row ?? null;
}

/** The evaluation of a run that was frozen last; null where none is. */
export async function findFrozenEvaluation(db: Handle, labId: string, runId: string): Promise<ListedRecord | null> {
  const [found] = await db
    .select(listColumns)
    .from(evaluations)
    .where(and(eq(evaluations.labId, labId), eq(evaluations.runId, runId), isNotNull(evaluations.frozenAt)))
    .orderBy(desc(evaluations.frozenAt), desc(evaluations.id))
    .limit(1);
  return found ?? null;
}
