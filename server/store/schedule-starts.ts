import { and, asc, eq, gte, inArray, isNull, lte, or } from 'drizzle-orm';
import { protocols, runs, scheduleStarts, schedules } from '@/db/schema';
import type { Handle } from './database';

/** What became of the single starts of schedules. */

export type StartRow = typeof scheduleStarts.$inferSelect;

export interface StartKey {
  labId: string;
  scheduleId: string;
  dueAt: number;
}

const ofStart = ({ labId, scheduleId, dueAt }: StartKey) =>
  and(eq(scheduleStarts.labId, labId), eq(scheduleStarts.scheduleId, scheduleId), eq(scheduleStarts.dueAt, dueAt));

/**
 * Decides about one start, if nobody has yet. Two servers may look at the same moment: one of them gets true. `runId`: of the run that a server which
 * takes the start is about to begin.
 */
export async function decideStart(
  db: Handle,
  start: StartKey,
  decision: { outcome: NonNullable<StartRow['outcome']>; why: string; runId?: string; nowUtcMs: number },
): Promise<boolean> {
  const { outcome, why, runId = null, nowUtcMs } = decision;
  const decided = { outcome, why, runId, decidedAt: nowUtcMs };
  const rows = await db
    .insert(scheduleStarts)
    .values({ ...start, ...decided })
    .onConflictDoUpdate({
      target: [scheduleStarts.labId, scheduleStarts.scheduleId, scheduleStarts.dueAt],
      set: decided,
      setWhere: isNull(scheduleStarts.outcome),
    })
    .returning({ dueAt: scheduleStarts.dueAt });
  return rows.length === 1;
}

/** What became of a start that a server had taken; false where something else did meanwhile. */
export async function concludeStart(
  db: Handle,
  start: StartKey,
  { from, outcome, why }: { from: readonly OpenStart['from'][]; outcome: 'started' | 'missed'; why: string },
): Promise<boolean> {
  const end = { outcome, why, ...(outcome === 'missed' ? { runId: null } : {}) };
  const changed = await db
    .update(scheduleStarts)
    .set(end)
    .where(and(ofStart(start), inArray(scheduleStarts.outcome, [...from])));
  return changed.rowCount === 1;
}

/** A start that a server took and did not bring to its end. */
export interface OpenStart {
  start: StartKey;
  from: 'taken' | 'started';
  rigId: string;
  protocolName: string;
  /** Its run, where there is one, in which nothing was ever done. */
  run: { id: string; failure: string } | null;
}

/** Starts that were taken before `beforeUtcMs` and neither missed nor begun: no run is there, or one of the last day without a single event. */
export async function openStarts(db: Handle, beforeUtcMs: number): Promise<OpenStart[]> {
  const unbegun = and(
    eq(scheduleStarts.outcome, 'started'),
    gte(scheduleStarts.decidedAt, beforeUtcMs - 86_400_000),
    eq(runs.lastSeq, 0),
    inArray(runs.state, ['starting', 'failed']),
  );
  const rows = await db
    .select({ row: scheduleStarts, rigId: schedules.rigId, protocolName: protocols.name, failure: runs.failure })
    .from(scheduleStarts)
    .innerJoin(schedules, and(eq(schedules.labId, scheduleStarts.labId), eq(schedules.id, scheduleStarts.scheduleId)))
    .innerJoin(protocols, and(eq(protocols.labId, schedules.labId), eq(protocols.id, schedules.protocolId)))
    .leftJoin(runs, and(eq(runs.labId, scheduleStarts.labId), eq(runs.id, scheduleStarts.runId)))
    .where(and(lte(scheduleStarts.decidedAt, beforeUtcMs), or(eq(scheduleStarts.outcome, 'taken'), unbegun)));
  return rows.map(({ row: { labId, scheduleId, dueAt, outcome, runId }, rigId, protocolName, failure }) => ({
    start: { labId, scheduleId, dueAt },
    from: outcome === 'taken' ? 'taken' : 'started',
    rigId,
    protocolName,
    run: outcome === 'taken' || runId === null ? null : { id: runId, failure: failure ?? '' },
  }));
}

/** Takes a skip back; false where the start was not skipped. */
export async function takeSkipBack(db: Handle, start: StartKey, nowUtcMs: number): Promise<boolean> {
  const changed = await db
    .update(scheduleStarts)
    .set({ outcome: null, why: '', decidedAt: nowUtcMs })
    .where(and(ofStart(start), eq(scheduleStarts.outcome, 'skipped')));
  return changed.rowCount === 1;
}

/** True for the first who announces that a start lacks its arm. */
export async function announceStart(db: Handle, start: StartKey, nowUtcMs: number): Promise<boolean> {
  const rows = await db
    .insert(scheduleStarts)
    .values({ ...start, announcedAt: nowUtcMs })
    .onConflictDoUpdate({
      target: [scheduleStarts.labId, scheduleStarts.scheduleId, scheduleStarts.dueAt],
      set: { announcedAt: nowUtcMs },
      setWhere: and(isNull(scheduleStarts.announcedAt), isNull(scheduleStarts.outcome)),
    })
    .returning({ dueAt: scheduleStarts.dueAt });
  return rows.length === 1;
}

/** What is known of single starts of these schedules in a span, UTC ms. */
export async function startsBetween(
  db: Handle,
  labId: string,
  { scheduleIds, fromUtcMs, toUtcMs }: { scheduleIds?: readonly string[]; fromUtcMs: number; toUtcMs: number },
): Promise<StartRow[]> {
  if (scheduleIds?.length === 0) return [];
  return db
    .select()
    .from(scheduleStarts)
    .where(
      and(
        eq(scheduleStarts.labId, labId),
        scheduleIds === undefined ? undefined : inArray(scheduleStarts.scheduleId, [...scheduleIds]),
        gte(scheduleStarts.dueAt, fromUtcMs),
        lte(scheduleStarts.dueAt, toUtcMs),
      ),
    )
    .orderBy(asc(scheduleStarts.dueAt));
}
