import * as z from 'zod';
import { isAlarmCode } from '@/shared/alarms/catalog';
import { ringingOf } from '@/shared/alarms/ringing';
import { answerAt, calleesOf, morningUtcMs, nextCallee, nextMorningUtcMs, triedAgainMs, type Callee } from '@/shared/alarms/rings';
import { formatClock } from '@/shared/lib/format-time';
import type { JobHandlers } from '../interfaces/jobs';
import { alarmJobKinds, deferToMorning, groupIds, kindOf, type AlarmRecord } from '../store/alarms';
import { findAlarm, noteTold, untoldAlarms } from '../store/alarms-read';
import * as calls from '../store/calls';
import { enqueueJob } from '../store/jobs';
import { findRun } from '../store/runs-read';
import { allRigNames } from '../store/rigs';
import { oneLine, tellPerson, worthAnotherTry, type Message, type TellParts, type Told } from './tell';

/** Telling people of alarms: one after the other until somebody acknowledges, what can wait in the morning, and that it is over. */

const occurrenceSchema = z.strictObject({ labId: z.string(), alarmId: z.string(), occurrence: z.number().int() });
type Occurrence = z.infer<typeof occurrenceSchema>;
const ringSchema = occurrenceSchema.extend({
  /** Whom nothing reached since somebody was reached last, or since they were all tried anew. */
  missed: z.array(z.string()).default([]),
  /** Of what they were tried with something failed that may go another time. */
  mayGo: z.boolean().default(false),
  /** How often all who were left were tried in vain. */
  rounds: z.number().int().default(0),
});
type Ring = z.infer<typeof ringSchema>;
/** What can wait, and an alarm that everybody was rung for, or nobody could be. */
const tellSchema = z.strictObject({ labId: z.string(), rung: occurrenceSchema.optional() });

export const alarmJobs = (parts: TellParts): JobHandlers => ({
  [alarmJobKinds.ring]: (job) => ring(parts, ringSchema.parse(job.payload)),
  [alarmJobKinds.over]: (job) => tellOver(parts, occurrenceSchema.parse(job.payload)),
  [alarmJobKinds.tell]: (job) => tellInMorning(parts, tellSchema.parse(job.payload)),
});

interface Around {
  timeZone: string;
  labName: string;
  callees: Callee[];
  members: calls.CallMember[];
  settings: Awaited<ReturnType<typeof calls.callSettingsOf>>;
  rigName: string | null;
  leftMs: number | null;
  /** When this was looked up, for a message that goes out now. */
  nowUtcMs: number;
}

async function around({ db, clock }: TellParts, alarm: AlarmRecord): Promise<Around> {
  const [settings, members, times, rigs, run] = await Promise.all([
    calls.callSettingsOf(db, alarm.labId),
    calls.callMembersOf(db, alarm.labId),
    calls.alarmTimes(db, alarm.labId),
    allRigNames(db, alarm.labId),
    alarm.runId === null ? null : findRun(db, alarm.labId, alarm.runId),
  ]);
  const endUtcMs = run?.predictedEndAt ?? null;
  const nowUtcMs = clock.utcMs();
  return {
    ...{ settings, members, timeZone: times.timeZone, labName: times.labName },
    callees: calleesOf(settings, members, run?.startedById ?? null),
    rigName: alarm.rigId === null ? null : (rigs.get(alarm.rigId) ?? null),
    leftMs: endUtcMs === null ? null : endUtcMs - nowUtcMs,
    nowUtcMs,
  };
}

export const placeOf = (rigName: string | null, labName: string) => rigName ?? labName;

type ForMessage = Pick<Around, 'rigName' | 'labName' | 'timeZone' | 'nowUtcMs'>;

function messageOf(alarm: AlarmRecord, { rigName, labName, timeZone, nowUtcMs }: ForMessage): Message {
  const kind = kindOf(alarm.code);
  const at = formatClock(alarm.raisedAt ?? alarm.changedAt, { timeZone, precision: 'seconds' });
  return {
    title: `${kind.title}: ${oneLine(placeOf(rigName, labName))}`,
    paragraphs: [
      `${at} ${timeZone}: ${oneLine(alarm.words === '' ? kind.cause : alarm.words)}`,
      `What it means: ${kind.consequence}`,
      `What to do: ${isAlarmCode(alarm.code) ? answerAt(alarm.code, formatClock(nowUtcMs, { timeZone })) : kind.answer}`,
      'Acknowledge it when you take care of it; otherwise the next person is rung.',
    ],
    path: `/alarms/${alarm.id}`,
    tag: `alarm-${alarm.id}`,
    quiet: false,
  };
}

const hopsOf = (
  alarm: AlarmRecord,
  to: { userId: string | null; name: string; at: number },
  told: readonly (Omit<Told, 'means'> & { means: Told['means'] | 'none' })[],
) =>
  told.map(({ means, outcome, detail }) => ({
    ...{ labId: alarm.labId, alarmId: alarm.id, occurrence: alarm.snapshot.occurrence },
    ...{ ...to, means, outcome, detail },
  }));

const isOver = (alarm: AlarmRecord | null, { occurrence }: Occurrence): alarm is null =>
  alarm === null || alarm.snapshot.occurrence !== occurrence || alarm.state !== 'active-unacknowledged' || alarm.causeId !== null;

/** Rings the next person, and asks for the one after in case nobody acknowledges. Only who was reached was rung. */
async function ring(parts: TellParts, asked: Ring): Promise<void> {
  const { db, clock } = parts;
  const which = { labId: asked.labId, alarmId: asked.alarmId, occurrence: asked.occurrence };
  const alarm = await findAlarm(db, which.labId, which.alarmId);
  if (alarm === null || isOver(alarm, which)) return;
  const about = await around(parts, alarm);
  const someoneNear = about.callees.some(({ near }) => near);
  const ringing =
    alarm.code === 'controller-reset' && isAlarmCode(alarm.code)
      ? ringingOf(alarm.code, { leftMs: about.leftMs, someoneNear })
      : alarm.rings;
  const known = await reachedFor(parts, alarm, which);
  const rung = [...known, ...asked.missed];
  const next = nextCallee(about.callees, { ringing, utcMs: clock.utcMs(), timeZone: about.timeZone, rung });
  if (next === null) return nobodyLeft(parts, alarm, { about, asked, anybody: known.length > 0, mayNever: ringing === 'morning' });
  const member = about.members.find(({ userId }) => userId === next.userId);
  if (member === undefined) return;
  const told = await tellPerson(parts, member, messageOf(alarm, about));
  const at = clock.utcMs();
  const reached = told.some(({ outcome }) => outcome === 'sent');
  await db.transaction(async (tx) => {
    await calls.writeHops(tx, hopsOf(alarm, { userId: next.userId, name: next.name, at }, told));
    const dueAtUtcMs = at + (reached ? about.settings.nextAfterMin * 60_000 : 0);
    const missed = { missed: [...asked.missed, next.userId], mayGo: asked.mayGo || worthAnotherTry(told) !== null };
    const payload: Ring = { ...asked, ...(reached ? { missed: [], mayGo: false } : missed) };
    await enqueueJob(tx, { kind: alarmJobKinds.ring, payload, labId: alarm.labId, nowUtcMs: at, dueAtUtcMs });
  });
}

/** What came shortly before explains an alarm. */
const explainedMs = 30 * 60_000;

/** Who was reached for the same cause: nobody is rung twice for one; raised anew it is another. */
async function reachedFor({ db }: TellParts, alarm: AlarmRecord, { occurrence }: Occurrence): Promise<string[]> {
  const group = await groupIds(db, alarm);
  const reached = await calls.reachedSince(db, alarm.labId, (alarm.raisedAt ?? 0) - explainedMs);
  return reached.flatMap((hop) =>
    hop.userId !== null && group.includes(hop.alarmId) && (hop.alarmId !== alarm.id || hop.occurrence === occurrence) ? [hop.userId] : [],
  );
}

interface Left {
  about: Around;
  asked: Ring;
  anybody: boolean;
  mayNever: boolean;
}

/** Everybody who may be rung was, or cannot be reached, or nobody may be now: that is said, those who were not reached are tried again, and the morning hears of it. */
async function nobodyLeft({ db, clock }: TellParts, alarm: AlarmRecord, { about, asked, anybody, mayNever }: Left): Promise<void> {
  const at = clock.utcMs();
  const { labId } = alarm;
  const { missed, mayGo, rounds, ...rung } = asked;
  const inVain = missed.length > 0;
  const againMs = mayGo ? triedAgainMs(rounds, anybody) : null;
  const detail =
    againMs !== null
      ? `nothing reached ${namesOf(about, missed)}: tried again in ${String(againMs / 60_000)} min`
      : whyNobody({ inVain, anybody, mayNever });
  const none = { userId: null, name: 'nobody', at };
  const { morningAt } = about.settings;
  const times = { morningAt, timeZone: about.timeZone };
  await db.transaction(async (tx) => {
    await calls.writeHops(tx, hopsOf(alarm, none, [{ means: 'none', outcome: 'failed', detail }]));
    if (againMs !== null) {
      const payload: Ring = { ...rung, missed: [], mayGo: false, rounds: rounds + 1 };
      await enqueueJob(tx, { kind: alarmJobKinds.ring, payload, labId, nowUtcMs: at, dueAtUtcMs: at + againMs });
    }
    const wasTold = rounds > 0;
    if (wasTold) return;
    const waits = !anybody && !inVain;
    if (waits) await deferToMorning(tx, alarm);
    const payload: z.infer<typeof tellSchema> = waits ? { labId } : { labId, rung };
    const dueAtUtcMs = waits ? morningUtcMs(at, times) : nextMorningUtcMs(at, times);
    await enqueueJob(tx, { kind: alarmJobKinds.tell, payload, labId, nowUtcMs: at, dueAtUtcMs });
  });
}

const namesOf = ({ members }: Around, missed: readonly string[]): string =>
  members
    .filter(({ userId }) => missed.includes(userId))
    .map(({ name }) => name)
    .join(', ');

function whyNobody({ inVain, anybody, mayNever }: { inVain: boolean; anybody: boolean; mayNever: boolean }): string {
  if (inVain) return 'not everybody on call could be reached, and nobody has acknowledged';
  if (anybody) return 'everybody on call was rung and nobody has acknowledged';
  return mayNever
    ? 'too little of the night is left, or nobody near is on call: told in the morning'
    : 'nobody on call may be rung at this hour: told in the morning';
}

/** Whoever was rung hears that somebody takes care, or that the condition is away. */
async function tellOver(parts: TellParts, which: Occurrence): Promise<void> {
  const alarm = await findAlarm(parts.db, which.labId, which.alarmId);
  if (alarm === null || alarm.snapshot.occurrence !== which.occurrence) return;
  const hops = await calls.hopsOfOccurrence(parts.db, which);
  const reached = new Set(hops.flatMap(({ userId, outcome }) => (userId !== null && outcome === 'sent' ? [userId] : [])));
  const about = await around(parts, alarm);
  const { acknowledged } = alarm.snapshot;
  const what = acknowledged === null ? 'The condition has gone away by itself.' : `${acknowledged.by} has acknowledged it and takes care.`;
  const title = `Over: ${messageOf(alarm, about).title}`;
  for (const member of about.members) {
    if (!reached.has(member.userId) || member.name === acknowledged?.by) continue;
    const told = await tellPerson(parts, member, { ...messageOf(alarm, about), title, paragraphs: [what], quiet: true });
    await calls.writeHops(
      parts.db,
      hopsOf(
        alarm,
        { userId: member.userId, name: member.name, at: parts.clock.utcMs() },
        told.map((each) => ({ ...each, detail: `that it is over${each.detail === '' ? '' : `; ${each.detail}`}` })),
      ),
    );
  }
}

/** Nobody has acknowledged it, and no mail of a morning told of it. */
const isUnheeded = ({ snapshot, toldAt }: AlarmRecord, rung: Occurrence | undefined): boolean =>
  snapshot.occurrence === rung?.occurrence && snapshot.acknowledged === null && toldAt === null;

/** One mail to each person on call with everything that could wait. */
async function tellInMorning(parts: TellParts, { labId, rung }: z.infer<typeof tellSchema>): Promise<void> {
  const { db, clock } = parts;
  const waiting = await untoldAlarms(db, labId);
  const rungInVain = rung === undefined ? null : await findAlarm(db, labId, rung.alarmId);
  if (rungInVain !== null && isUnheeded(rungInVain, rung) && !waiting.some(({ id }) => id === rungInVain.id)) waiting.push(rungInVain);
  const [first] = waiting;
  if (first === undefined) return;
  const about = await around(parts, first);
  const rigs = await allRigNames(db, labId);
  const lines = waiting.map((alarm) => {
    const { title, paragraphs } = messageOf(alarm, { ...about, rigName: alarm.rigId === null ? null : (rigs.get(alarm.rigId) ?? null) });
    const still = alarm.snapshot.active ? 'It still stands.' : 'It has gone away by itself.';
    return [title, paragraphs[0], paragraphs[2], still].join('\n');
  });
  const count = waiting.length === 1 ? 'One alarm' : `${String(waiting.length)} alarms`;
  const title = waiting.length === 1 ? messageOf(first, about).title : `${count} that could wait: ${oneLine(about.labName)}`;
  const outcomes: Told[] = [];
  for (const { userId, name } of about.callees) {
    const member = about.members.find((one) => one.userId === userId);
    if (member === undefined) continue;
    const told = await tellPerson(parts, member, { title, paragraphs: lines, path: '/alarms', tag: `morning-${labId}`, quiet: true });
    outcomes.push(...told);
    const at = clock.utcMs();
    await calls.writeHops(
      db,
      waiting.flatMap((alarm) => hopsOf(alarm, { userId, name, at }, told)),
    );
  }
  const failed = worthAnotherTry(outcomes);
  if (failed !== null) throw new Error(`Nobody could be told what waits: ${failed.detail}`);
  await noteTold(db, { labId, ids: waiting.map(({ id }) => id), utcMs: clock.utcMs() });
}
