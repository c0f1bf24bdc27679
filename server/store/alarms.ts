import { and, eq, gte, inArray, ne, or, sql } from 'drizzle-orm';
import { alarmHistory, alarms } from '@/db/schema';
import { alarmKinds, isAlarmCode, type AlarmCode, type Ringing } from '@/shared/alarms/catalog';
import { consequencesOf, firstCauseOf, type GroupMember } from '@/shared/alarms/grouping';
import {
  advanceAlarm,
  alarmDueUtcMs,
  isStanding,
  quietAlarm,
  shownState,
  type AlarmEvent,
  type AlarmFact,
  type AlarmRefusal,
  type AlarmRule,
} from '@/shared/alarms/machine';
import { morningUtcMs } from '@/shared/alarms/rings';
import { alarmTimes } from './calls';
import { one, type Handle, type Transaction } from './database';
import { enqueueJob } from './jobs';

/** Alarms in PostgreSQL: one row and one machine for each condition at each place, all that happens in the history. */

export type AlarmRecord = typeof alarms.$inferSelect;

/** Where a condition is looked for. */
export interface AlarmPlace {
  labId: string;
  rigId: string | null;
  code: AlarmCode;
  /** What on the rig or in the lab; empty where there is only one. */
  subject: string;
}

export interface Reported {
  met: boolean;
  /** What was found, in a sentence. */
  words: string;
  runId: string | null;
  /** Where they are not those of the kind. */
  rings?: Ringing;
  onDelayS?: number;
  /** Why it cannot mean anything now; null while it can. */
  suppressedWhy?: string | null;
  /** Since when it is so, where that is known better than by now. */
  sinceUtcMs?: number | undefined;
  utcMs: number;
}

/** Kinds of jobs that tell people of alarms. */
export const alarmJobKinds = { ring: 'alarm.ring', over: 'alarm.over', tell: 'alarm.tell' } as const;

const ruleOf = (row: Pick<AlarmRecord, 'code' | 'onDelayS'>): AlarmRule => {
  const kind = kindOf(row.code);
  return row.onDelayS === null ? kind : { ...kind, onDelayS: row.onDelayS };
};

/** An alarm of a later version goes by the rules of an ordinary one. */
export const kindOf = (code: string) => alarmKinds[isAlarmCode(code) ? code : 'held'];

/** Alarms of a lab change one after the other, for each may be grouped with others. */
const inTurn = (tx: Handle, labId: string) => tx.execute(sql`select pg_advisory_xact_lock(hashtextextended(${`alarms ${labId}`}, 0))`);

const atPlace = ({ labId, rigId, code, subject }: AlarmPlace) =>
  and(
    eq(alarms.labId, labId),
    eq(alarms.code, code),
    rigId === null ? sql`${alarms.rigId} is null` : eq(alarms.rigId, rigId),
    eq(alarms.subject, subject),
  );

/** Takes a condition in as it was found; a place where it was never met gets no row. */
export async function reportCondition(tx: Transaction, place: AlarmPlace, found: Reported): Promise<void> {
  await inTurn(tx, place.labId);
  let [row] = await tx.select().from(alarms).where(atPlace(place));
  if (row === undefined) {
    if (!found.met) return;
    row = one(
      await tx
        .insert(alarms)
        .values({
          ...place,
          rings: found.rings ?? alarmKinds[place.code].rings,
          state: 'normal',
          snapshot: quietAlarm,
          changedAt: found.utcMs,
        })
        .returning(),
    );
  }
  const fresh = found.met
    ? { words: found.words, runId: found.runId, rings: found.rings ?? kindOf(row.code).rings, onDelayS: found.onDelayS ?? null }
    : {};
  const { suppressedWhy = null, utcMs } = found;
  if (suppressedWhy !== row.snapshot.suppressedWhy) {
    const event =
      suppressedWhy === null ? ({ type: 'unsuppress', utcMs } as const) : ({ type: 'suppress', why: suppressedWhy, utcMs } as const);
    const done = await advance(tx, { ...row, ...fresh }, event);
    if (done?.ok === true) row = done.alarm;
  }
  await advance(tx, { ...row, ...fresh }, { type: 'condition', met: found.met, sinceUtcMs: found.sinceUtcMs, utcMs });
}

export type ActOutcome = { ok: true; alarm: AlarmRecord } | { ok: false; refusal: AlarmRefusal } | null;

/** An act of a person, or the passing of time. Null: the lab has no such alarm. */
export async function actOnAlarm(tx: Transaction, key: { labId: string; alarmId: string }, event: AlarmEvent): Promise<ActOutcome> {
  await inTurn(tx, key.labId);
  const [row] = await tx
    .select()
    .from(alarms)
    .where(and(eq(alarms.labId, key.labId), eq(alarms.id, key.alarmId)));
  return row === undefined ? null : advance(tx, row, event);
}

async function advance(tx: Transaction, row: AlarmRecord, event: AlarmEvent): Promise<ActOutcome> {
  const rule = ruleOf(row);
  const step = advanceAlarm(row.snapshot, event, rule);
  if (!step.ok) return step;
  const { alarm, facts } = step;
  const raised = facts.includes('raised');
  const grouped = raised ? await groupOf(tx, row, event.utcMs) : {};
  const change = {
    ...{ words: row.words, runId: row.runId, rings: row.rings, onDelayS: row.onDelayS, changedAt: event.utcMs },
    ...{ snapshot: alarm, state: shownState(alarm), raisedAt: alarm.raisedUtcMs, dueAt: alarmDueUtcMs(alarm, rule) },
    ...grouped,
    ...(raised ? { toldAt: null } : {}),
  };
  const own = and(eq(alarms.labId, row.labId), eq(alarms.id, row.id));
  const after = one(await tx.update(alarms).set(change).where(own).returning());
  await writeHistory(tx, after, { facts, event });
  if (raised) await askToTell(tx, after, event.utcMs);
  else if (facts.includes('acknowledged') || wentUnseen(facts, after)) await askToTellOver(tx, after, event.utcMs);
  return { ok: true, alarm: after };
}

const lookBackMs = 30 * 60_000;

async function groupOf(tx: Transaction, row: AlarmRecord, utcMs: number): Promise<{ causeId: string | null }> {
  const rows = await tx
    .select()
    .from(alarms)
    .where(and(eq(alarms.labId, row.labId), or(ne(alarms.state, 'normal'), gte(alarms.raisedAt, utcMs - lookBackMs))));
  const members = rows.flatMap((each): GroupMember[] =>
    each.raisedAt === null || !isAlarmCode(each.code) || each.id === row.id
      ? []
      : [
          {
            id: each.id,
            code: each.code,
            rigId: each.rigId,
            raisedUtcMs: each.raisedAt,
            causeId: each.causeId,
            standing: isStanding(each.snapshot),
          },
        ],
  );
  if (!isAlarmCode(row.code)) return { causeId: null };
  const raised = { id: row.id, code: row.code, rigId: row.rigId, raisedUtcMs: utcMs };
  const causeId = firstCauseOf(raised, members);
  const later = consequencesOf(raised, members);
  if (later.length > 0)
    await tx
      .update(alarms)
      .set({ causeId: causeId ?? row.id })
      .where(and(eq(alarms.labId, row.labId), inArray(alarms.id, later)));
  return { causeId };
}

const words: Partial<Record<AlarmEvent['type'], (event: AlarmEvent) => string>> = {
  shelve: (event) => ('reason' in event ? event.reason : ''),
  'take-out': (event) => ('reason' in event ? event.reason : ''),
  suppress: (event) => ('why' in event ? event.why : ''),
  confirm: (event) => ('note' in event ? event.note : ''),
};

/** Facts that nobody does, also where somebody's act brings them about. */
const byItself: readonly AlarmFact[] = ['raised', 'returned', 'latched'];

async function writeHistory(
  tx: Transaction,
  { labId, id, snapshot, runId, words: found }: AlarmRecord,
  { facts, event }: { facts: AlarmFact[]; event: AlarmEvent },
): Promise<void> {
  if (facts.length === 0) return;
  const by = 'by' in event ? event.by : '';
  const said = words[event.type]?.(event) ?? '';
  await tx.insert(alarmHistory).values(
    facts.map((fact) => ({
      ...{ labId, alarmId: id, at: event.utcMs, fact, occurrence: snapshot.occurrence, runId },
      by: byItself.includes(fact) ? '' : by,
      words: fact === 'raised' ? found : said,
    })),
  );
}

/** Whoever has to hear of it does so by a job, in the same transaction. A consequence does not ring beside its cause. */
async function askToTell(tx: Transaction, alarm: AlarmRecord, utcMs: number): Promise<void> {
  const { labId, id: alarmId, rings, causeId, snapshot } = alarm;
  if (rings === 'never' || causeId !== null) return;
  const { morningAt, timeZone } = await alarmTimes(tx, labId);
  const waits = rings === 'morning';
  await enqueueJob(tx, {
    kind: waits ? alarmJobKinds.tell : alarmJobKinds.ring,
    payload: waits ? { labId } : { labId, alarmId, occurrence: snapshot.occurrence },
    ...{ labId, nowUtcMs: utcMs, dueAtUtcMs: waits ? morningUtcMs(utcMs, { morningAt, timeZone }) : utcMs },
  });
}

/** The condition went away before anybody acknowledged: nobody need get up any more. */
const wentUnseen = (facts: readonly AlarmFact[], { state }: AlarmRecord) =>
  facts.includes('returned') && state === 'returned-unacknowledged';

/** Whoever was rung hears that it is over. */
async function askToTellOver(tx: Transaction, { labId, id: alarmId, rings, snapshot }: AlarmRecord, nowUtcMs: number): Promise<void> {
  if (rings !== 'always' && rings !== 'allowed') return;
  await enqueueJob(tx, { kind: alarmJobKinds.over, payload: { labId, alarmId, occurrence: snapshot.occurrence }, labId, nowUtcMs });
}

/** The alarm, its cause and all that follows from the same cause. */
export async function groupIds(db: Handle, { labId, id, causeId }: AlarmRecord): Promise<string[]> {
  const cause = causeId ?? id;
  const rows = await db
    .select({ id: alarms.id })
    .from(alarms)
    .where(and(eq(alarms.labId, labId), eq(alarms.causeId, cause)));
  return [cause, ...rows.map((row) => row.id)];
}

/** It is told with what can wait. */
export async function deferToMorning(db: Handle, { labId, id }: AlarmRecord): Promise<void> {
  await db
    .update(alarms)
    .set({ rings: 'morning', toldAt: null })
    .where(and(eq(alarms.labId, labId), eq(alarms.id, id)));
}
