import { and, eq, gt, isNotNull, isNull, lte, notInArray, or, sql } from 'drizzle-orm';
import { alarms, arms, rigLeases, rigs, runs } from '@/db/schema';
import type { AlarmCode } from '@/shared/alarms/catalog';
import type { Handle } from './database';
import { endedStates } from './run-store';

/** A rig that no process drives. */
export interface LeftRig {
  labId: string;
  rigId: string;
  name: string;
  /** Its unfinished run; null: none. */
  runId: string | null;
  armed: boolean;
}

/** Rigs that no process has driven for longer than `forMs`, by PostgreSQL's clock, or ever. */
export async function leftRigs(db: Handle, { forMs, nowUtcMs }: { forMs: number; nowUtcMs: number }): Promise<LeftRig[]> {
  const long = lte(rigLeases.untilAt, sql`clock_timestamp() - ${forMs}::double precision * interval '1 millisecond'`);
  const unfinished = and(
    ...[eq(runs.labId, rigs.labId), eq(runs.rigId, rigs.id), eq(runs.rehearsal, false), notInArray(runs.state, endedStates)],
  );
  const standing = and(...[eq(arms.labId, rigs.labId), eq(arms.rigId, rigs.id), isNull(arms.endedAt), gt(arms.untilAt, nowUtcMs)]);
  return db
    .select({ labId: rigs.labId, rigId: rigs.id, name: rigs.name, runId: runs.id, armed: sql<boolean>`${arms.id} is not null` })
    .from(rigs)
    .leftJoin(rigLeases, and(eq(rigLeases.labId, rigs.labId), eq(rigLeases.rigId, rigs.id)))
    .leftJoin(runs, unfinished)
    .leftJoin(arms, standing)
    .where(or(isNull(rigLeases.rigId), long));
}

/** Rigs at which such an alarm holds as far as the database knows. */
export async function rigsWithAlarm(db: Handle, code: AlarmCode): Promise<{ labId: string; rigId: string }[]> {
  const rows = await db
    .select({ labId: alarms.labId, rigId: alarms.rigId })
    .from(alarms)
    .where(and(eq(alarms.code, code), isNotNull(alarms.rigId), sql`(${alarms.snapshot}->>'met')::boolean`));
  return rows.map(({ labId, rigId }) => ({ labId, rigId: rigId ?? '' }));
}
