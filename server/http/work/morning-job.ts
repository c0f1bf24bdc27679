import * as z from 'zod';
import type { RunStart } from '@/shared/archive/run-records';
import { morningLines } from '@/shared/morning/words';
import type { Job } from '../../interfaces/jobs';
import { askForRunNotice } from '../../notify/run-notices';
import type { Handle } from '../../store/database';
import { listEvaluations, queueEvaluation } from '../../store/evaluations';
import { enqueueJob } from '../../store/jobs';
import { findRun, type RunRecord } from '../../store/runs-read';
import { outcomeOf } from '../archive-input';
import { channelToEvaluate } from '../channel-to-evaluate';
import { isoOrNull } from '../maker';
import { morningOf } from '../morning';
import { ProblemError } from '../problem-error';
import type { Services } from '../services';

/** When a run is over it is evaluated, if it can be, and whoever started it gets the morning sheet. */

export const morningJobKind = 'run.morning';
const payloadSchema = z.strictObject({ labId: z.string(), runId: z.string(), looks: z.number().int() });

/** Until then what devices and the simulated balance still had in hand is stored. */
const settleMs = 120_000;
/** An evaluation is looked for so often, and waited for no longer than an hour. */
const lookAgainMs = 15_000;
const mostLooks = 240;
/** A run that was shorter is a trial, of which nobody wants a sheet (no source). */
const shortestNightMs = 1_800_000;
const byServer = 'Evenfall';

export const askForMorning = ({ database, clock }: Services, { labId, runId }: RunStart): Promise<unknown> =>
  lookIn(database.db, { labId, runId, looks: 0 }, { nowUtcMs: clock.utcMs(), inMs: settleMs });

const lookIn = (db: Handle, payload: z.infer<typeof payloadSchema>, { nowUtcMs, inMs }: { nowUtcMs: number; inMs: number }) =>
  enqueueJob(db, { kind: morningJobKind, payload, labId: payload.labId, nowUtcMs, dueAtUtcMs: nowUtcMs + inMs });

/** Evaluates the run where nobody has, looks again until the evaluation is over, and sends the sheet. */
export async function workMorning(services: Services, job: Job): Promise<void> {
  const { looks, ...own } = payloadSchema.parse(job.payload);
  const { db } = services.database;
  const run = await findRun(db, own.labId, own.runId);
  if (run === null || run.startedAt === null || (run.endedAt ?? run.startedAt) - run.startedAt < shortestNightMs) return;
  const known = (await listEvaluations(db, own.labId, own.runId)).filter(({ recomputes }) => recomputes === null);
  const atWork = known.some(({ state }) => state === 'queued' || state === 'running');
  const channel = known.length > 0 ? null : await channelOf(services, run);
  if ((channel === null && !atWork) || looks >= mostLooks) return sendMorning(services, run);
  const nowUtcMs = services.clock.utcMs();
  await db.transaction(async (tx) => {
    if (channel !== null) await queueEvaluation(tx, { ...own, channel, clock: null, createdAt: nowUtcMs, createdBy: byServer });
    await lookIn(tx, { ...own, looks: looks + 1 }, { nowUtcMs, inMs: lookAgainMs });
  });
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

const outcomes = { finished: 'Finished', stopped: 'Stopped', failed: 'Failed', held: 'Held' };

async function sendMorning(services: Services, run: RunRecord): Promise<void> {
  const { labId, id: runId, start } = run;
  const sheet = await morningOf(services, run);
  // Nothing was measured: that it ended was told already.
  if (sheet.dwells.done === 0) return;
  const ended = {
    state: outcomes[outcomeOf(run)],
    endedAt: isoOrNull(run.endedAt),
    reason: run.failure ?? '',
    timeZone: start.timeZone,
  };
  const text = morningLines(sheet, ended).join('\n');
  await askForRunNotice(services.database.db, { labId, runId, topic: 'morning', text }, services.clock.utcMs());
  services.pokeJobs();
}
