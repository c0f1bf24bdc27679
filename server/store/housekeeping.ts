import { and, inArray, lte } from 'drizzle-orm';
import { jobs, passwordResets } from '@/db/schema';
import type { Database } from './database';
import { sweepIdempotencyKeys } from './idempotency';
import { sweepRateLimits } from './rate-limits';
import { sweepQuestions } from './rig-questions';
import { settleSamples } from './sample-months';
import { sweepSessions } from './session-rows';

const minuteMs = 60_000;
const dayMs = 24 * 3_600_000;
/** Given-up jobs stay this long for whoever wants to know why. */
const keptJobsMs = 30 * dayMs;
const monthsAhead = 3;

/** What has to be done now and then (at start and each hour): makes partitions ahead and for what came in without one, removes what has expired. */
export async function keepHouse(db: Database, nowUtcMs: number): Promise<void> {
  await settleSamples(db, { nowUtcMs, monthsAhead });
  await sweepSessions(db, nowUtcMs);
  await sweepIdempotencyKeys(db, nowUtcMs);
  await sweepRateLimits(db, nowUtcMs);
  await sweepQuestions(db, nowUtcMs - minuteMs);
  await db.delete(passwordResets).where(lte(passwordResets.expiresAt, nowUtcMs - dayMs));
  await db.delete(jobs).where(and(inArray(jobs.state, ['done', 'given-up']), lte(jobs.finishedAt, nowUtcMs - keptJobsMs)));
}
