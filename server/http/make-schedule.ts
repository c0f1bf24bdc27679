import { checkProtocol } from '@/shared/protocol/check';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { againstRoom, overlap, type Stay } from '@/shared/schedule/room';
import type { Transaction } from '../store/database';
import { findRevision } from '../store/protocols';
import { findMassSet, findRig } from '../store/rigs';
import { findSchedule, hoursOfRoom, insertSchedule, standingSchedules, type NewSchedule, type ScheduleRecord } from '../store/schedules';
import { audited } from './audited';
import type { Caller } from './begin-run';
import { stayOf, type Room } from './calendar';
import { notFound, ProblemError } from './problem-error';
import { refusalOf } from './refused-protocol';

const dayMs = 86_400_000;
/** How far ahead two schedules of a rig are held against each other. */
const foreseenDays = 60;

/**
 * Makes a schedule. What can be seen now to fail is refused now: a protocol that the rig cannot run, a first start against the
 * hours of the room, a run that would meet another one on the same rig.
 */
export async function makeSchedule(caller: Caller, wanted: NewSchedule): Promise<ScheduleRecord> {
  const { services, membership, me } = caller;
  const { db } = services.database;
  const nowUtcMs = services.clock.utcMs();
  const rig = await findRig(db, wanted.labId, wanted.rigId);
  if (rig === null) throw notFound('rig');
  const revision = await findRevision(db, wanted, wanted.protocolRevision);
  if (revision === null) throw notFound('protocol revision');
  const massSet = await findMassSet(db, wanted, wanted.massSetId);
  if (massSet === null) throw notFound('mass set');
  const refusal = refusalOf(checkProtocol(revision.document, { ...rig.document, sources: massSet.sources }));
  if (refusal !== null) throw refusal;
  const room = { document: rig.document, hours: await hoursOfRoom(db, wanted), timeZone: membership.timeZone };
  const plan = { plan: wanted.plan, protocol: revision.document, sources: massSet.sources };
  const stays = staysOf(plan, room, nowUtcMs);
  const [first] = stays;
  if (first === undefined) throw new ProblemError('not-possible-now', noStartWords(wanted, room.timeZone, nowUtcMs));
  const against = againstRoom(room.hours, first, room.timeZone);
  if (against !== null)
    throw new ProblemError(
      'not-possible-now',
      `The first start would be ${formatDayAndClock(first.startUtcMs, room.timeZone)}. ${against}`,
    );
  const entry = { kind: 'schedule.made', data: (id: string) => ({ scheduleId: id, ...wanted }) };
  const id = await audited(caller, entry, async (tx) => {
    await assertFree(tx, { wanted, stays, room, nowUtcMs });
    return insertSchedule(tx, wanted, { userId: me.userId, name: me.name, at: nowUtcMs });
  });
  const made = await findSchedule(db, wanted.labId, id);
  if (made === null) throw new Error('the new schedule was not found');
  return made;
}

function staysOf(schedule: Pick<ScheduleRecord, 'plan' | 'protocol' | 'sources'>, room: Room, nowUtcMs: number): Stay[] {
  const span = { afterUtcMs: nowUtcMs, untilUtcMs: nowUtcMs + foreseenDays * dayMs };
  const near = occurrencesBetween(schedule.plan, room.timeZone, span);
  // One that begins later than can be foreseen is judged by its first start.
  const found = near.length > 0 ? near : occurrencesBetween(schedule.plan, room.timeZone, { ...span, untilUtcMs: Infinity, atMost: 1 });
  return found.map(({ dueUtcMs }) => stayOf(schedule, room, dueUtcMs));
}

function noStartWords({ plan }: NewSchedule, timeZone: string, nowUtcMs: number): string {
  const now = formatDayAndClock(nowUtcMs, timeZone);
  return plan.kind === 'once'
    ? `${plan.date} ${plan.time} is past: it is now ${now}. Choose a time that lies ahead.`
    : `No start lies ahead: it is now ${now}. Choose later days.`;
}

interface Claim {
  wanted: NewSchedule;
  stays: readonly Stay[];
  room: Room;
  nowUtcMs: number;
}

async function assertFree(tx: Transaction, { wanted, stays, room, nowUtcMs }: Claim): Promise<void> {
  const at = (utcMs: number) => formatDayAndClock(utcMs, room.timeZone);
  const own = stays.findIndex((stay, index) => index > 0 && overlap(stays[index - 1] as Stay, stay));
  if (own > 0) {
    const [before, after] = [stays[own - 1] as Stay, stays[own] as Stay];
    throw new ProblemError(
      'not-possible-now',
      `The run that starts ${at(before.startUtcMs)} would still go on at the next start, ${at(after.startUtcMs)}. Leave out days, or choose a shorter protocol.`,
    );
  }
  for (const other of await standingSchedules(tx, wanted.labId)) {
    if (other.rigId !== wanted.rigId) continue;
    const theirs = staysOf(other, room, nowUtcMs);
    const met = stays.flatMap((stay) => theirs.filter((their) => overlap(stay, their)))[0];
    if (met !== undefined)
      throw new ProblemError(
        'not-possible-now',
        `${other.rigName} is taken then: ${other.madeBy} scheduled "${other.protocolName}" from ${at(met.startUtcMs)} to ${at(met.endUtcMs)}. Choose another time, or skip or end that schedule.`,
      );
  }
}
