import { and, desc, eq, inArray, sql } from 'drizzle-orm';
import { jobs } from '@/db/schema';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { Job, JobQueue } from '../interfaces/jobs';
import { one, type Database, type Handle } from './database';

const leaseMs = 30_000;
const firstRetryMs = 5_000;
const longestRetryMs = 3_600_000;

/** Asks for work, in the transaction of the fact that causes it. */
export async function enqueueJob(
  db: Handle,
  job: { kind: string; payload: unknown; labId: string | null; nowUtcMs: number; dueAtUtcMs?: number; maxAttempts?: number },
): Promise<{ id: string }> {
  const { nowUtcMs, dueAtUtcMs = nowUtcMs, maxAttempts = 8, ...fields } = job;
  const row = one(
    await db
      .insert(jobs)
      .values({ ...fields, maxAttempts, dueAt: dueAtUtcMs, createdAt: nowUtcMs })
      .returning({ id: jobs.id }),
  );
  return row;
}

/** Asks for work of a lab unless such work waits or goes on already. */
export async function askForWorkOnce(db: Handle, job: { kind: string; payload: unknown; labId: string; nowUtcMs: number }): Promise<void> {
  const atWork = and(eq(jobs.kind, job.kind), eq(jobs.labId, job.labId), inArray(jobs.state, ['waiting', 'running']));
  const [known] = await db.select({ id: jobs.id }).from(jobs).where(atWork).limit(1);
  if (known === undefined) await enqueueJob(db, job);
}

/** Work of a lab that was given up, newest first; house-keeping removes it after 30 days. */
export const givenUpJobs = (db: Handle, labId: string) =>
  db
    .select()
    .from(jobs)
    .where(and(eq(jobs.labId, labId), eq(jobs.state, 'given-up')))
    .orderBy(desc(jobs.finishedAt))
    .limit(100);

const retries = 3;

/** Lets given-up work be tried again. False where the lab has no such job. The count of attempts goes on, for it fences workers off. */
export async function retryGivenUpJob(db: Handle, job: { labId: string; jobId: string }, nowUtcMs: number): Promise<boolean> {
  const done = await db
    .update(jobs)
    .set({ state: 'waiting', maxAttempts: sql`${jobs.attempts} + ${retries}`, dueAt: nowUtcMs, finishedAt: null })
    .where(and(eq(jobs.labId, job.labId), eq(jobs.id, job.jobId), eq(jobs.state, 'given-up')));
  return done.rowCount === 1;
}

/**
 * The queue of one worker. A job is leased for 30 s and taken with `FOR UPDATE SKIP LOCKED`, so that workers never
 * wait for each other; attempts are 5 s, 10 s, 20 s … at most 1 h apart.
 * @param holder name of this worker, for people who look into the table
 */
export function createJobQueue(db: Database, holder: string, nowUtcMs: () => number): JobQueue {
  // The attempt's number fences: whoever lost the lease and comes back late holds a lower one.
  const held = (job: Job) => and(eq(jobs.id, job.id), eq(jobs.state, 'running'), eq(jobs.attempts, job.attempt));
  return {
    take: (kinds) => take(db, { kinds, holder, nowUtcMs: nowUtcMs() }),
    renew: async (job) => {
      const renewed = await db
        .update(jobs)
        .set({ leaseUntil: nowUtcMs() + leaseMs })
        .where(held(job));
      return renewed.rowCount === 1;
    },
    finish: async (job) => {
      await db.update(jobs).set({ state: 'done', finishedAt: nowUtcMs(), leaseUntil: null, lastError: null }).where(held(job));
    },
    fail: async (job, why) => {
      const last = job.attempt >= job.maxAttempts;
      const retryMs = Math.min(longestRetryMs, firstRetryMs * 2 ** (job.attempt - 1));
      const next = last
        ? { state: 'given-up' as const, finishedAt: nowUtcMs() }
        : { state: 'waiting' as const, dueAt: nowUtcMs() + retryMs };
      await db
        .update(jobs)
        .set({ ...next, leaseUntil: null, lastError: why.slice(0, 2000) })
        .where(held(job));
    },
    giveBack: async (job) => {
      await db
        .update(jobs)
        .set({ state: 'waiting', attempts: job.attempt - 1, dueAt: nowUtcMs(), leaseUntil: null })
        .where(held(job));
    },
  };
}

async function take(db: Database, want: { kinds: readonly string[]; holder: string; nowUtcMs: number }): Promise<Job | null> {
  const now = sql`${timestampOfUtcMs(want.nowUtcMs)}::timestamptz`;
  const lapsed = sql`(${jobs.state} = 'running' and ${jobs.leaseUntil} <= ${now})`;
  // A job that brings its worker down each time must not do so for ever.
  await db
    .update(jobs)
    .set({ state: 'given-up', finishedAt: want.nowUtcMs, leaseUntil: null, lastError: 'the worker died during the last attempt' })
    .where(sql`${lapsed} and ${jobs.attempts} >= ${jobs.maxAttempts}`);
  const next = db
    .select({ id: jobs.id })
    .from(jobs)
    .where(sql`${jobs.kind} in ${[...want.kinds]} and ((${jobs.state} = 'waiting' and ${jobs.dueAt} <= ${now}) or ${lapsed})`)
    .orderBy(jobs.dueAt)
    .limit(1)
    .for('update', { skipLocked: true });
  const [row] = await db
    .update(jobs)
    .set({ state: 'running', attempts: sql`${jobs.attempts} + 1`, holder: want.holder, leaseUntil: want.nowUtcMs + leaseMs })
    .where(eq(jobs.id, sql`(${next})`))
    .returning();
  return row === undefined
    ? null
    : { id: row.id, labId: row.labId, kind: row.kind, payload: row.payload, attempt: row.attempts, maxAttempts: row.maxAttempts };
}
