import * as z from 'zod';
import type { RunStart } from '@/shared/archive/run-records';
import { morningLines } from '@/shared/morning/words';
import type { Job } from '../../interfaces/jobs';
import { askForRunNotice } from '../../notify/run-notices';
import { listEvaluations, queueEvaluation } from '../../store/evaluations';
import { enqueueJob } from '../../store/jobs';
import { findRun, type RunRecord } from '../../store/runs-read';
import { channelToEvaluate } from '../channel-to-evaluate';
import { isoOrNull } from '../maker';
import { morningOf } from '../morning';
import { ProblemError } from '../problem-error';
import type { Services } from '../services';

/** When a run is over it is evaluated, if it can be, and whoever started it gets the morning sheet. */

export const morningJobKind = 'run.morning';
const payloadSchema = z.strictObject({ labId: z.string(), runId: z.string() });

/** Until then what devices and the simulated balance still had in hand is stored. */
const settleMs = 120_000;
const byServer = 'Evenfall';

export async function askForMorning(services: Services, { labId, runId }: RunStart): Promise<void> {
  const nowUtcMs = services.clock.utcMs();
  const payload: z.infer<typeof payloadSchema> = { labId, runId };
  await enqueueJob(services.database.db, { kind: morningJobKind, payload, labId, nowUtcMs, dueAtUtcMs: nowUtcMs + settleMs });
}

export async function workMorning(services: Services, job: Job): Promise<void> {
  const { labId, runId } = payloadSchema.parse(job.payload);
  const { db } = services.database;
  const run = await findRun(db, labId, runId);
  if (run === null) return;
  const evaluated = (await listEvaluations(db, labId, runId)).length > 0;
  const channel = evaluated ? null : await channelOf(services, run);
  if (channel === null) return sendMorning(services, run);
  const createdAt = services.clock.utcMs();
  await db.transaction((tx) => queueEvaluation(tx, { labId, runId, channel, createdAt, createdBy: byServer, morning: true }));
  services.pokeJobs();
}

/** Null where nothing has been brought in yet, or a person has to choose. */
async function channelOf(services: Services, run: RunRecord): Promise<string | null> {
  try {
    return await channelToEvaluate(services, run, undefined);
  } catch (error) {
    if (error instanceof ProblemError) return null;
    throw error;
  }
}

const states: Partial<Record<RunRecord['state'], string>> = { finished: 'Finished', stopped: 'Stopped', failed: 'Failed' };

export async function sendMorning(services: Services, run: RunRecord): Promise<void> {
  const { labId, id: runId, start } = run;
  const sheet = await morningOf(services, run);
  // Nothing was measured: that it ended was told already.
  if (sheet.dwells.done === 0) return;
  const ended = {
    state: states[run.state] ?? 'Held',
    endedAt: isoOrNull(run.endedAt),
    reason: run.failure ?? '',
    timeZone: start.timeZone,
  };
  const text = morningLines(sheet, ended).join('\n');
  await askForRunNotice(services.database.db, { labId, runId, topic: 'morning', text }, services.clock.utcMs());
  services.pokeJobs();
}
