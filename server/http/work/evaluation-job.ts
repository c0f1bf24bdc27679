import * as z from 'zod';
import { CutShort, type Job } from '@/server/interfaces/jobs';
import { beginEvaluation, endEvaluation, findEvaluation } from '@/server/store/evaluations';
import { findRun } from '@/server/store/runs-read';
import { archiveInputOf } from '../archive-input';
import type { Services } from '../services';
import { softwareVersion } from '../software';

const payloadSchema = z.strictObject({ labId: z.string(), evaluationId: z.string() });

/** Evaluates a run in a worker thread, from the very archive that a reviewer would download. */
export async function workEvaluation(services: Services, job: Job): Promise<void> {
  const payload = payloadSchema.parse(job.payload);
  const { db } = services.database;
  const evaluation = await beginEvaluation(db, payload);
  if (evaluation === null) return;
  const run = await findRun(db, evaluation.labId, evaluation.runId);
  if (run === null) throw new Error('the run of an evaluation is gone');
  try {
    const again = evaluation.recomputes === null ? null : await findEvaluation(db, evaluation.labId, evaluation.recomputes);
    const input = await archiveInputOf(services, run, (again ?? evaluation).createdAt);
    const found = await services.tasks.evaluate(input, { channel: evaluation.channel, clock: evaluation.clock });
    const finishedAt = services.clock.utcMs();
    await endEvaluation(db, payload, { ...found, channel: evaluation.channel, software: softwareVersion, finishedAt });
  } catch (error) {
    if (error instanceof CutShort || (!isUnusable(error) && job.attempt < job.maxAttempts)) throw error;
    const why = error instanceof Error ? error.message : String(error);
    await endEvaluation(db, payload, { error: why, finishedAt: services.clock.utcMs() });
    if (!isUnusable(error)) services.log.error({ err: error, runId: run.id }, 'an evaluation failed');
  }
}

/** The data are at fault, not the program: trying again gives the same. */
const isUnusable = (error: unknown) => error instanceof Error && 'code' in error && error.code === 'unusable-archive';
