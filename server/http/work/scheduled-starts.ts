import { may } from '@/shared/contracts/roles';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { againstRoom } from '@/shared/schedule/room';
import { reportCondition } from '@/server/store/alarms';
import { appendAudit } from '@/server/store/audit';
import type { Transaction } from '@/server/store/database';
import { askForScheduleMail } from '@/server/store/mail-requests';
import { memberOf } from '@/server/store/people';
import { findMassSet, findRig, type RigRecord } from '@/server/store/rigs';
import { markRunFailed } from '@/server/store/runs-read';
import * as starts from '@/server/store/schedule-starts';
import * as store from '@/server/store/schedules';
import { beginRun, type Claim } from '../begin-run';
import { stayOf, type Room } from '../calendar';
import { ProblemError } from '../problem-error';
import type { Services } from '../services';

const minuteMs = 60_000;
/** A start that is later than this is missed: nobody reckons with it any more. */
const latestMs = 10 * minuteMs;
/** A missing arm is announced this long before. */
const announcedMs = 120 * minuteMs;

/** A server that took a start has begun its run before so long has passed, or has ended. */
const takenForMs = minuteMs;

/**
 * What a schedule needs each minute, never twice at a time: starts that are due begin their runs or are missed with a reason, and a start in the next
 * two hours whose rig will not be armed until its end is announced. A schedule never arms.
 */
export async function heedSchedules(services: Services): Promise<void> {
  for (const open of await starts.openStarts(services.database.db, services.clock.utcMs() - takenForMs)) {
    try {
      await settle(services, open);
    } catch (error) {
      services.log.error({ err: error, scheduleId: open.start.scheduleId }, 'what became of a scheduled start could not be stored');
    }
  }
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
    await db.transaction(async (tx) => {
      if (await starts.decideStart(tx, start, { outcome: 'missed', why, nowUtcMs }))
        await tellMissed(tx, { ...schedule, start, why, nowUtcMs });
    });
    return true;
  };
  if (late) return missed(`No server drove the rig at ${formatDayAndClock(dueUtcMs, room.timeZone)}.`);
  const against = againstRoom(room.hours, stayOf(schedule, room, dueUtcMs), room.timeZone);
  if (against !== null) return missed(against);
  // Taken first and started then: whatever happens in between, no start is made twice.
  const runId = services.newId();
  if (!(await starts.decideStart(db, start, { outcome: 'taken', why: '', runId, nowUtcMs }))) return true;
  try {
    await begin(services, planned, { runId, take: (tx) => started(tx, start) });
  } catch (error) {
    const why = error instanceof ProblemError ? error.message : null;
    // Whatever else went wrong, it is not known here what of it was stored: it is looked at again later.
    if (why === null) services.log.error({ err: error, scheduleId: schedule.id }, 'a scheduled start failed');
    else await miss(services, { ...schedule, start, why }, ['taken', 'started']);
  }
  return true;
}

/** In the transaction that stores the run: the start is told to be made when there is a run, and never otherwise. */
async function started(tx: Transaction, start: starts.StartKey): Promise<void> {
  if (await starts.concludeStart(tx, start, { from: ['taken'], outcome: 'started', why: '' })) return;
  throw new ProblemError('not-possible-now', 'Starting the run took so long that the start counts as missed.');
}

/** A start that was taken, and then its server was killed, or its database went away. */
async function settle(services: Services, { start, from, run, ...of }: starts.OpenStart): Promise<void> {
  if (run === null) {
    const why = 'The server was ended, or its database went away, while it was starting the run.';
    return miss(services, { ...of, start, why }, [from]);
  }
  // A run that some process drives, or is about to take up, is none of this.
  if (services.stations.get(of.rigId) === null || services.supervisor.takenBy(of.rigId) !== null) return;
  const why = run.failure === '' ? 'The server failed to start it; its log says why.' : run.failure;
  const { db } = services.database;
  await markRunFailed(db, { labId: start.labId, id: run.id }, { why, nowUtcMs: services.clock.utcMs() });
  await miss(services, { ...of, start, why }, [from]);
}

/** In the name of whoever made the schedule, who must still be allowed to. */
async function begin(services: Services, { schedule, rig, room }: Planned, claim: Claim): Promise<void> {
  const { db } = services.database;
  const member = await memberOf(db, schedule.labId, schedule.madeById);
  if (member === null || !may(member.role, 'run.start'))
    throw new ProblemError('not-allowed', `${schedule.madeBy}, who made the schedule, may not start runs any more.`);
  const massSet = await findMassSet(db, schedule, schedule.massSetId);
  if (massSet === null) throw new ProblemError('not-found', 'The mass set of the schedule is gone.');
  const membership = { labId: schedule.labId, labName: '', timeZone: room.timeZone, role: member.role };
  await beginRun(
    { me: { userId: member.userId, name: member.name }, membership, services },
    {
      rig,
      protocolId: schedule.protocolId,
      protocol: schedule.protocol,
      revision: schedule.protocolRevision,
      massSet,
      notes: schedule.notes,
      claim,
    },
  );
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
    if (await starts.announceStart(db, start, nowUtcMs)) await askForScheduleMail(db, { ...start, what: 'not-armed' }, nowUtcMs);
  }
  const place = { labId: schedule.labId, rigId: schedule.rigId, code: 'not-armed' as const, subject: schedule.id };
  const due = unarmedUtcMs === null ? '' : formatDayAndClock(unarmedUtcMs, room.timeZone);
  const words = `${schedule.protocolName} is to start ${due}.`;
  await db.transaction((tx) => reportCondition(tx, place, { met: unarmedUtcMs !== null, words, runId: null, utcMs: nowUtcMs }));
}

interface Missed extends Pick<starts.OpenStart, 'rigId' | 'protocolName' | 'start'> {
  why: string;
}

/** Where nothing else became of the start meanwhile: stored and told together. */
async function miss(services: Services, missed: Missed, from: readonly starts.OpenStart['from'][]): Promise<void> {
  const nowUtcMs = services.clock.utcMs();
  await services.database.db.transaction(async (tx) => {
    if (await starts.concludeStart(tx, missed.start, { from, outcome: 'missed', why: missed.why }))
      await tellMissed(tx, { ...missed, nowUtcMs });
  });
}

async function tellMissed(tx: Transaction, missed: Missed & { nowUtcMs: number }): Promise<void> {
  const { start, rigId, protocolName, why, nowUtcMs: utcMs } = missed;
  await askForScheduleMail(tx, { ...start, what: 'missed' }, utcMs);
  const place = { labId: start.labId, rigId, code: 'missed-start' as const, subject: start.scheduleId };
  await reportCondition(tx, place, { met: true, words: `${protocolName}: ${why}`, runId: null, utcMs });
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
