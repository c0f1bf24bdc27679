import * as z from 'zod';
import { isAlarmCode } from '@/shared/alarms/catalog';
import { ringingOf } from '@/shared/alarms/ringing';
import { answerAt, calleesOf, morningUtcMs, nextCallee, type Callee } from '@/shared/alarms/rings';
import { formatClock } from '@/shared/lib/format-time';
import type { JobHandlers } from '../interfaces/jobs';
import { alarmJobKinds, deferToMorning, groupIds, kindOf, type AlarmRecord } from '../store/alarms';
import { findAlarm, noteTold, untoldAlarms } from '../store/alarms-read';
import * as calls from '../store/calls';
import { enqueueJob } from '../store/jobs';
import { findRun } from '../store/runs-read';
import { allRigNames } from '../store/rigs';
import { oneLine, tellPerson, type Message, type TellParts, type Told } from './tell';

/** Telling people of alarms: one after the other until somebody acknowledges, what can wait in the morning, and that it is over. */

const occurrenceSchema = z.strictObject({ labId: z.string(), alarmId: z.string(), occurrence: z.number().int() });
const labSchema = z.strictObject({ labId: z.string() });
type Occurrence = z.infer<typeof occurrenceSchema>;

export const alarmJobs = (parts: TellParts): JobHandlers => ({
  [alarmJobKinds.ring]: (job) => ring(parts, occurrenceSchema.parse(job.payload)),
  [alarmJobKinds.over]: (job) => tellOver(parts, occurrenceSchema.parse(job.payload)),
  [alarmJobKinds.tell]: (job) => tellInMorning(parts, labSchema.parse(job.payload).labId),
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

/** Rings the next person, and asks for the one after in case nobody acknowledges. */
async function ring(parts: TellParts, which: Occurrence): Promise<void> {
  const { db, clock } = parts;
  const alarm = await findAlarm(db, which.labId, which.alarmId);
  if (alarm === null || isOver(alarm, which)) return;
  const about = await around(parts, alarm);
  const someoneNear = about.callees.some(({ near }) => near);
  const ringing =
    alarm.code === 'controller-reset' && isAlarmCode(alarm.code)
      ? ringingOf(alarm.code, { leftMs: about.leftMs, someoneNear })
      : alarm.rings;
  const group = await groupIds(db, alarm);
  // Nobody is rung twice for one cause; raised anew it is another.
  const rung = (await calls.rungSince(db, alarm.labId, (alarm.raisedAt ?? 0) - explainedMs)).filter(
    ({ alarmId, occurrence }) => group.includes(alarmId) && (alarmId !== alarm.id || occurrence === which.occurrence),
  );
  const known = rung.flatMap(({ userId }) => (userId === null ? [] : [userId]));
  const next = nextCallee(about.callees, { ringing, utcMs: clock.utcMs(), timeZone: about.timeZone, rung: known });
  if (next === null) return nobodyLeft(parts, alarm, { about, anybody: known.length > 0, mayNever: ringing === 'morning' });
  const member = about.members.find(({ userId }) => userId === next.userId);
  if (member === undefined) return;
  const told = await tellPerson(parts, member, messageOf(alarm, about));
  const at = clock.utcMs();
  const reached = told.some(({ outcome }) => outcome === 'sent');
  await db.transaction(async (tx) => {
    await calls.writeHops(tx, hopsOf(alarm, { userId: next.userId, name: next.name, at }, told));
    const dueAtUtcMs = at + (reached ? about.settings.nextAfterMin * 60_000 : 0);
    await enqueueJob(tx, { kind: alarmJobKinds.ring, payload: which, labId: alarm.labId, nowUtcMs: at, dueAtUtcMs });
  });
}

/** What came shortly before explains an alarm. */
const explainedMs = 30 * 60_000;

/** Everybody who may be rung was, or nobody may be now: that is said, and then it waits for the morning. */
async function nobodyLeft(
  { db, clock }: TellParts,
  alarm: AlarmRecord,
  { about, anybody, mayNever }: { about: Around; anybody: boolean; mayNever: boolean },
): Promise<void> {
  const at = clock.utcMs();
  const detail = anybody
    ? 'everybody on call was rung and nobody has acknowledged'
    : mayNever
      ? 'too little of the night is left, or nobody near is on call: told in the morning'
      : 'nobody on call may be rung at this hour: told in the morning';
  await db.transaction(async (tx) => {
    await calls.writeHops(tx, hopsOf(alarm, { userId: null, name: 'nobody', at }, [{ means: 'none', outcome: 'failed', detail }]));
    if (anybody) return;
    await deferToMorning(tx, alarm);
    const dueAtUtcMs = morningUtcMs(at, { morningAt: about.settings.morningAt, timeZone: about.timeZone });
    await enqueueJob(tx, { kind: alarmJobKinds.tell, payload: { labId: alarm.labId }, labId: alarm.labId, nowUtcMs: at, dueAtUtcMs });
  });
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

/** One mail to each person on call with everything that could wait. */
async function tellInMorning(parts: TellParts, labId: string): Promise<void> {
  const { db, clock } = parts;
  const waiting = await untoldAlarms(db, labId);
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
  for (const { userId, name } of about.callees) {
    const member = about.members.find((one) => one.userId === userId);
    if (member === undefined) continue;
    const told = await tellPerson(parts, member, { title, paragraphs: lines, path: '/alarms', tag: `morning-${labId}`, quiet: true });
    const at = clock.utcMs();
    await calls.writeHops(
      db,
      waiting.flatMap((alarm) => hopsOf(alarm, { userId, name, at }, told)),
    );
  }
  await noteTold(db, { labId, ids: waiting.map(({ id }) => id), utcMs: clock.utcMs() });
}
