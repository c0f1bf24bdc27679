import * as z from 'zod';
import type { SimulatedRun } from '@/shared/archive/run-records';
import { CutShort, type Job } from '@/server/interfaces/jobs';
import { findOrMakeChannel } from '@/server/store/imports';
import { findRun, markRunFailed, storeRehearsal } from '@/server/store/runs-read';
import { progressOf, storedRunView } from '../run-view';
import type { Services } from '../services';

/** Kind of the jobs that rehearse. */
export const rehearsalJobKind = 'rehearse';

const payloadSchema = z.strictObject({ labId: z.string(), runId: z.string() });
export type RehearsalJob = z.infer<typeof payloadSchema>;

/** Rehearses in a worker thread and stores what it leaves like a run: steps, events, samples. */
export async function workRehearsal(services: Services, job: Job): Promise<void> {
  const { labId, runId } = payloadSchema.parse(job.payload);
  const { db } = services.database;
  const run = await findRun(db, labId, runId);
  if (run === null || run.state !== 'rehearsing') return;
  const simulated = run.start.simulated as SimulatedRun;
  try {
    const records = await services.tasks.rehearse({ start: { ...run.start, simulated }, startUtcMs: run.createdAt });
    for (const series of records.channels) {
      const channel = await findOrMakeChannel(db, {
        labId,
        rigId: run.rigId,
        runId,
        ...series.info,
        source: 'simulated',
        createdAt: services.clock.utcMs(),
      });
      await services.samples.append(labId, channel.id, { utcMs: series.utcMs, value: series.value });
    }
    await storeRehearsal(db, run, records);
  } catch (error) {
    if (error instanceof CutShort || job.attempt < job.maxAttempts) throw error;
    await markRunFailed(db, run, {
      why: `The rehearsal came to no end: ${error instanceof Error ? error.message : String(error)}`,
      nowUtcMs: services.clock.utcMs(),
    });
    services.log.error({ err: error, runId }, 'a rehearsal failed');
  }
  const done = await findRun(db, labId, runId);
  if (done !== null) services.runChanged(runId, { events: [], steps: [], progress: progressOf(await storedRunView(services, done)) });
}
