import * as z from 'zod';
import type { Job } from '@/server/interfaces/jobs';
import { appendAudit } from '@/server/store/audit';
import { askForWorkOnce, enqueueJob } from '@/server/store/jobs';
import { channelsWithRig, cutoffOf, keepingOf, labsThatThin, rulesOf } from '@/server/store/retention';
import { takeUntold, thinNext } from '@/server/store/thinning';
import type { Services } from '../services';

/** Old samples are thinned to their summaries as the rules of a lab say, a few in each job, so that evaluations need not wait. */

export const thinningJobKind = 'samples.thin';
const payloadSchema = z.strictObject({ labId: z.string() });

/** Some 2 s of work. */
const stepsOfJob = 10;

/** Once a day: every lab that does not keep everything. */
export async function askForThinning({ database: { db }, clock, pokeJobs }: Services): Promise<void> {
  for (const labId of await labsThatThin(db))
    await askForWorkOnce(db, { kind: thinningJobKind, payload: { labId }, labId, nowUtcMs: clock.utcMs() });
  pokeJobs();
}

export async function workThinning(services: Services, job: Job): Promise<void> {
  const { labId } = payloadSchema.parse(job.payload);
  const { database, clock } = services;
  const nowUtcMs = clock.utcMs();
  let left = stepsOfJob;
  const rules = await rulesOf(database.db, labId);
  for (const { channel } of await channelsWithRig(database.db, labId)) {
    const key = { labId, channelId: channel.id, rigId: channel.rigId };
    const { days, holdsFromUtcMs } = keepingOf(rules, channel.id);
    if (days !== null && holdsFromUtcMs !== null && holdsFromUtcMs <= nowUtcMs) {
      const by = { cutoffUtcMs: cutoffOf(days, nowUtcMs), nowUtcMs };
      while (left > 0 && (await thinNext(database, key, by)) !== null) left -= 1;
      if (left === 0) return goOn(services, labId);
    }
    // Also what an earlier job had no time to tell.
    await tell(services, { ...key, name: channel.name, days });
  }
}

async function goOn({ database: { db }, clock, pokeJobs }: Services, labId: string): Promise<void> {
  await enqueueJob(db, { kind: thinningJobKind, payload: { labId }, labId, nowUtcMs: clock.utcMs() });
  pokeJobs();
}

async function tell(
  { database: { db }, clock, sha256 }: Services,
  channel: { labId: string; channelId: string; rigId: string; name: string; days: number | null },
): Promise<void> {
  const { labId, channelId, rigId, name, days } = channel;
  await db.transaction(async (tx) => {
    const told = await takeUntold(tx, channel);
    if (told === null) return;
    const { samples, fromUtcMs, toUtcMs } = told;
    const iso = (utcMs: number) => new Date(utcMs).toISOString();
    const data = { rigId, channelId, channel: name, samples, fromAt: iso(fromUtcMs), toAt: iso(toUtcMs), keepDays: days };
    await appendAudit(tx, { labId, who: { id: null, name: 'Evenfall' }, kind: 'samples.thinned', data, utcMs: clock.utcMs() }, sha256);
  });
}
