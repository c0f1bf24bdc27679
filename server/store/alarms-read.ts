import { and, asc, desc, eq, gte, inArray, lt, lte, ne, sql } from 'drizzle-orm';
import { alarmHistory, alarms } from '@/db/schema';
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
      ...{ code: alarms.code, rigId: alarms.rigId },
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
