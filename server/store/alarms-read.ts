import { and, asc, desc, eq, gte, inArray, isNull, lt, lte, ne, or, sql } from 'drizzle-orm';
import { alarmHistory, alarmHops, alarms } from '@/db/schema';
import type { AlarmRecord } from './alarms';
import type { Handle } from './database';

/** What is read of alarms. */

export async function findAlarm(db: Handle, labId: string, alarmId: string): Promise<AlarmRecord | null> {
  const [row] = await db
    .select()
    .from(alarms)
    .where(and(eq(alarms.labId, labId), eq(alarms.id, alarmId)));
  return row ?? null;
}

/** All that are not at rest, the newest raised first, hidden ones too. */
export const standingAlarms = (db: Handle, labId: string): Promise<AlarmRecord[]> =>
  db
    .select()
    .from(alarms)
    .where(and(eq(alarms.labId, labId), ne(alarms.state, 'normal')))
    .orderBy(desc(alarms.raisedAt), desc(alarms.changedAt))
    .limit(200);

/** Those for which something is due by time. */
export const dueAlarms = (db: Handle, utcMs: number): Promise<{ labId: string; id: string }[]> =>
  db.select({ labId: alarms.labId, id: alarms.id }).from(alarms).where(lte(alarms.dueAt, utcMs)).orderBy(asc(alarms.dueAt)).limit(200);

/** Conditions that hold as far as the database knows, of one rig or of the labs as a whole: what is no longer so has to be reported. */
export const metAlarms = (db: Handle, labId: string, rigId: string | null): Promise<AlarmRecord[]> =>
  db
    .select()
    .from(alarms)
    .where(
      and(
        eq(alarms.labId, labId),
        rigId === null ? sql`${alarms.rigId} is null` : eq(alarms.rigId, rigId),
        sql`(${alarms.snapshot}->>'met')::boolean`,
      ),
    );

/** Waiting to be told in the morning. */
export const untoldAlarms = (db: Handle, labId: string): Promise<AlarmRecord[]> =>
  db
    .select()
    .from(alarms)
    .where(
      and(
        ...[eq(alarms.labId, labId), eq(alarms.rings, 'morning'), sql`${alarms.toldAt} is null`, sql`${alarms.raisedAt} is not null`],
        sql`${alarms.causeId} is null`,
      ),
    )
    .orderBy(asc(alarms.raisedAt))
    .limit(100);

export async function noteTold(db: Handle, { labId, ids, utcMs }: { labId: string; ids: readonly string[]; utcMs: number }): Promise<void> {
  if (ids.length === 0) return;
  await db
    .update(alarms)
    .set({ toldAt: utcMs })
    .where(and(eq(alarms.labId, labId), inArray(alarms.id, [...ids])));
}

export type AlarmHistoryRow = typeof alarmHistory.$inferSelect;

/** The history of a lab or of one alarm, newest first. */
export function alarmHistoryPage(
  db: Handle,
  page: { labId: string; alarmId: string | null; beforeSeq: number | null; limit: number },
): Promise<(AlarmHistoryRow & { code: string; rigId: string | null })[]> {
  return db
    .select({
      ...{ labId: alarmHistory.labId, seq: alarmHistory.seq, alarmId: alarmHistory.alarmId, at: alarmHistory.at },
      ...{ fact: alarmHistory.fact, occurrence: alarmHistory.occurrence, by: alarmHistory.by, words: alarmHistory.words },
      ...{ runId: alarmHistory.runId, code: alarms.code, rigId: alarms.rigId },
    })
    .from(alarmHistory)
    .innerJoin(alarms, and(eq(alarms.labId, alarmHistory.labId), eq(alarms.id, alarmHistory.alarmId)))
    .where(
      and(
        eq(alarmHistory.labId, page.labId),
        page.alarmId === null ? undefined : eq(alarmHistory.alarmId, page.alarmId),
        page.beforeSeq === null ? undefined : lt(alarmHistory.seq, page.beforeSeq),
      ),
    )
    .orderBy(desc(alarmHistory.seq))
    .limit(page.limit);
}

/** How often each kind was raised since, for the page of counts. */
export const alarmCounts = (db: Handle, labId: string, sinceUtcMs: number): Promise<{ code: string; count: number }[]> =>
  db
    .select({ code: alarms.code, count: sql<number>`count(*)::int` })
    .from(alarmHistory)
    .innerJoin(alarms, and(eq(alarms.labId, alarmHistory.labId), eq(alarms.id, alarmHistory.alarmId)))
    .where(and(eq(alarmHistory.labId, labId), eq(alarmHistory.fact, 'raised'), gte(alarmHistory.at, sinceUtcMs)))
    .groupBy(alarms.code)
    .orderBy(desc(sql`count(*)`), asc(alarms.code));

const mostOfRun = 200;
/** An alarm that stands for longer than this before a run begins is no news of that run. */
const standsAtMostMs = 7 * 86_400_000;

export interface RunWindow {
  labId: string;
  runId: string;
  rigId: string;
  fromUtcMs: number;
  /** Null: it goes on. */
  toUtcMs: number | null;
}

/** History of the alarms that were raised for a run, and of those of its rig or of the whole lab that may have stood meanwhile; oldest first. */
export async function historyOfRun(db: Handle, { labId, runId, rigId, fromUtcMs, toUtcMs }: RunWindow): Promise<AlarmHistoryRow[]> {
  const { alarmId, occurrence, at } = alarmHistory;
  const meanwhile = and(
    isNull(alarmHistory.runId),
    gte(at, fromUtcMs - standsAtMostMs),
    toUtcMs === null ? undefined : lte(at, toUtcMs),
    or(isNull(alarms.rigId), eq(alarms.rigId, rigId)),
  );
  const raised = await db
    .select({ alarmId, occurrence })
    .from(alarmHistory)
    .innerJoin(alarms, and(eq(alarms.labId, alarmHistory.labId), eq(alarms.id, alarmId)))
    .where(and(eq(alarmHistory.labId, labId), eq(alarmHistory.fact, 'raised'), or(eq(alarmHistory.runId, runId), meanwhile)))
    .orderBy(desc(alarmHistory.seq))
    .limit(mostOfRun);
  if (raised.length === 0) return [];
  return db
    .select()
    .from(alarmHistory)
    .where(and(eq(alarmHistory.labId, labId), anyOf(raised, alarmHistory)))
    .orderBy(asc(alarmHistory.seq));
}

interface OccurrenceKey {
  alarmId: string;
  occurrence: number;
}

const anyOf = (keys: readonly OccurrenceKey[], table: typeof alarmHistory | typeof alarmHops) =>
  or(...keys.map(({ alarmId, occurrence }) => and(eq(table.alarmId, alarmId), eq(table.occurrence, occurrence))));

/** Alarms by their ids. */
export const alarmsById = (db: Handle, labId: string, ids: readonly string[]): Promise<AlarmRecord[]> =>
  ids.length === 0
    ? Promise.resolve([])
    : db
        .select()
        .from(alarms)
        .where(and(eq(alarms.labId, labId), inArray(alarms.id, [...ids])));

/** Whom a message of these occurrences reached, each once. */
export const reachedBy = (db: Handle, labId: string, keys: readonly OccurrenceKey[]): Promise<(OccurrenceKey & { name: string })[]> =>
  keys.length === 0
    ? Promise.resolve([])
    : db
        .selectDistinct({ alarmId: alarmHops.alarmId, occurrence: alarmHops.occurrence, name: alarmHops.name })
        .from(alarmHops)
        .where(and(eq(alarmHops.labId, labId), eq(alarmHops.outcome, 'sent'), anyOf(keys, alarmHops)))
        .orderBy(asc(alarmHops.name));
