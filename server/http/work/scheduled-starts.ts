import { may } from '@/shared/contracts/roles';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { againstRoom } from '@/shared/schedule/room';
import { reportCondition } from '@/server/store/alarms';
import { appendAudit } from '@/server/store/audit';
import { askForScheduleMail } from '@/server/store/mail-requests';
import { memberOf } from '@/server/store/people';
import { findMassSet, findRig, type RigRecord } from '@/server/store/rigs';
import * as store from '@/server/store/schedules';
import { beginRun } from '../begin-run';
import { stayOf, type Room } from '../calendar';
import { ProblemError } from '../problem-error';
import type { Services } from '../services';

const minuteMs = 60_000;
/** A start that is later than this is missed: nobody reckons with it any more. */
const latestMs = 10 * minuteMs;
/** A missing arm is announced this long before. */
const announcedMs = 120 * minuteMs;

/**
 * What a schedule needs each minute: starts that are due begin their runs or are missed with a reason, and a start in the next two hours
 * whose rig will not be armed until its end is announced. A schedule never arms.
 */
export async function heedSchedules(services: Services): Promise<void> {
  for (const schedule of await store.standingSchedules(services.database.db)) {
    try {
      await heed(services, schedule);
    } catch (error) {
      services.log.error({ err: error, scheduleId: schedule.id }, 'a schedule could not be heeded');
    }
  }
}

async function heed(services: Services, schedule: store.ScheduleRecord): Promise<void> {
  const { db } = services.database;
  const nowUtcMs = services.clock.utcMs();
  const { timeZone } = schedule;
  const rig = await findRig(db, schedule.labId, schedule.rigId);
  if (rig === null) return;
  const room: Room = { document: rig.document, hours: await store.hoursOfRoom(db, schedule), timeZone };
  let decidedUntilMs = nowUtcMs;
  if (schedule.state === 'active') {
    const due = occurrencesBetween(schedule.plan, timeZone, { afterUtcMs: schedule.decidedUntilAt, untilUtcMs: nowUtcMs });
    for (const { dueUtcMs } of due)
      if (!(await startOne(services, { schedule, rig, room }, dueUtcMs))) decidedUntilMs = Math.min(decidedUntilMs, dueUtcMs - 1);
    await announceMissingArm(services, { schedule, rig, room }, nowUtcMs);
  }
  await store.setDecidedUntil(db, schedule, decidedUntilMs);
  if (decidedUntilMs === nowUtcMs && !hasMore(schedule, timeZone, nowUtcMs)) await endOf(services, schedule);
}

interface Planned {
  schedule: store.ScheduleRecord;
  rig: RigRecord;
  room: Room;
}

/** False where it is left to the server that drives the rig. */
async function startOne(services: Services, planned: Planned, dueUtcMs: number): Promise<boolean> {
  const { schedule, room } = planned;
  const { db } = services.database;
  const nowUtcMs = services.clock.utcMs();
  const start = { labId: schedule.labId, scheduleId: schedule.id, dueAt: dueUtcMs };
  const late = nowUtcMs - dueUtcMs > latestMs;
  if (services.stations.get(schedule.rigId) === null && !late) return false;
  const missed = async (why: string) => {
    if (await store.decideStart(db, start, { outcome: 'missed', why, nowUtcMs })) await tellMissed(services, schedule, { start, why });
    return true;
  };
  if (late) return missed(`No server drove the rig at ${formatDayAndClock(dueUtcMs, room.timeZone)}.`);
  const against = againstRoom(room.hours, stayOf(schedule, room, dueUtcMs), room.timeZone);
  if (against !== null) return missed(against);
  // Taken first and started then: whatever happens in between, no start is made twice.
  if (!(await store.decideStart(db, start, { outcome: 'taken', why: '', nowUtcMs }))) return true;
  try {
    const runId = await begin(services, planned);
    await store.concludeStart(db, start, { outcome: 'started', why: '', runId });
  } catch (error) {
    if (!(error instanceof ProblemError)) services.log.error({ err: error, scheduleId: schedule.id }, 'a scheduled start failed');
    const why = error instanceof ProblemError ? error.message : 'The server failed to start it; its log says why.';
    await store.concludeStart(db, start, { outcome: 'missed', why, runId: null });
    await tellMissed(services, schedule, { start, why });
  }
  return true;
}

/** In the name of whoever made the schedule, who must still be allowed to. */
async function begin(services: Services, { schedule, rig, room }: Planned): Promise<string> {
  const { db } = services.database;
  const member = await memberOf(db, schedule.labId, schedule.madeById);
  if (member === null || !may(member.role, 'run.start'))
    throw new ProblemError('not-allowed', `${schedule.madeBy}, who made the schedule, may not start runs any more.`);
  const massSet = await findMassSet(db, schedule, schedule.massSetId);
  if (massSet === null) throw new ProblemError('not-found', 'The mass set of the schedule is gone.');
  const membership = { labId: schedule.labId, labName: '', timeZone: room.timeZone, role: member.role };
  const run = await beginRun(
    { me: { userId: member.userId, name: member.name }, membership, services },
    {
      rig,
      protocolId: schedule.protocolId,
      protocol: schedule.protocol,
      revision: schedule.protocolRevision,
      massSet,
      notes: schedule.notes,
    },
  );
  return run.id;
}

/** Nobody is at the rig in the middle of the night: whoever made the schedule must hear in time that it will not start. */
async function announceMissingArm(services: Services, { schedule, room }: Planned, nowUtcMs: number): Promise<void> {
  const { db } = services.database;
  const soon = occurrencesBetween(schedule.plan, room.timeZone, { afterUtcMs: nowUtcMs, untilUtcMs: nowUtcMs + announcedMs });
  if (services.stations.get(schedule.rigId) === null) return;
  let unarmedUtcMs: number | null = null;
  for (const { dueUtcMs } of soon) {
    const arm = services.arms.armOf(schedule.rigId);
    if (arm !== null && arm.untilUtcMs > stayOf(schedule, room, dueUtcMs).endUtcMs) continue;
    const start = { labId: schedule.labId, scheduleId: schedule.id, dueAt: dueUtcMs };
    unarmedUtcMs ??= dueUtcMs;
    if (await store.announceStart(db, start, nowUtcMs)) await askForScheduleMail(db, { ...start, what: 'not-armed' }, nowUtcMs);
  }
  const place = { labId: schedule.labId, rigId: schedule.rigId, code: 'not-armed' as const, subject: schedule.id };
  const due = unarmedUtcMs === null ? '' : formatDayAndClock(unarmedUtcMs, room.timeZone);
  const words = `${schedule.protocolName} is to start ${due}.`;
  await db.transaction((tx) => reportCondition(tx, place, { met: unarmedUtcMs !== null, words, runId: null, utcMs: nowUtcMs }));
}

async function tellMissed(
  services: Services,
  { rigId, protocolName }: store.ScheduleRecord,
  missed: { start: store.StartKey; why: string },
): Promise<void> {
  const { start, why } = missed;
  const utcMs = services.clock.utcMs();
  await services.database.db.transaction(async (tx) => {
    await askForScheduleMail(tx, { ...start, what: 'missed' }, utcMs);
    const place = { labId: start.labId, rigId, code: 'missed-start' as const, subject: start.scheduleId };
    await reportCondition(tx, place, { met: true, words: `${protocolName}: ${why}`, runId: null, utcMs });
  });
}

const hasMore = ({ plan }: store.ScheduleRecord, timeZone: string, nowUtcMs: number): boolean =>
  occurrencesBetween(plan, timeZone, { afterUtcMs: nowUtcMs, untilUtcMs: Infinity, atMost: 1 }).length > 0;

/** After its last start a schedule ends by itself. */
async function endOf(services: Services, { labId, id }: store.ScheduleRecord): Promise<void> {
  const nowUtcMs = services.clock.utcMs();
  await services.database.db.transaction(async (tx) => {
    if (!(await store.changeScheduleState(tx, { labId, scheduleId: id }, { state: 'ended', nowUtcMs }))) return;
    const who = { id: null, name: 'the scheduler' };
    const fact = { labId, who, kind: 'schedule.ended', data: { scheduleId: id }, utcMs: nowUtcMs };
    await appendAudit(tx, fact, services.sha256);
  });
}
