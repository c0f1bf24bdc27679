import type { CalendarItem, ScheduleView } from '@/shared/contracts/schedules';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import { occurrencesBetween, type Occurrence } from '@/shared/schedule/occurrences';
import { openHours, type RoomHours } from '@/shared/schedule/plan';
import { againstRoom, type Stay } from '@/shared/schedule/room';
import type { Handle } from '../store/database';
import { findRig, listRigs, type RigRecord } from '../store/rigs';
import { startsBetween, type StartRow } from '../store/schedule-starts';
import { allSchedules, hoursOfRooms, type ScheduleRecord } from '../store/schedules';
import { isoOf, isoOrNull } from './maker';

export function scheduleViewOf(schedule: ScheduleRecord): ScheduleView {
  const { id, rigId, rigName, protocolId, protocolName, protocolRevision, massSetLabel, plan, notes, state, madeBy, madeAt } = schedule;
  return {
    id,
    rigId,
    rigName,
    protocolId,
    protocolName,
    protocolRevision,
    massSetLabel,
    plan,
    notes,
    state,
    madeBy,
    madeAt: isoOf(madeAt),
  };
}

/** What decides how long a scheduled run takes and whether it may. */
export interface Room {
  /** Revision that holds now. */
  document: RigDocument;
  hours: RoomHours;
  timeZone: string;
}

/** From a start until the predicted end of its run; the sources stand at home when it starts. */
export function stayOf({ protocol, sources }: Pick<ScheduleRecord, 'protocol' | 'sources'>, room: Room, dueUtcMs: number): Stay {
  const rig = { ...room.document, sources };
  const start = { utcMs: dueUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 };
  return { startUtcMs: dueUtcMs, endUtcMs: planTimeline({ protocol, rig, timeZone: room.timeZone }, start).endUtcMs };
}

export interface CalendarSpan {
  labId: string;
  timeZone: string;
  fromUtcMs: number;
  untilUtcMs: number;
  /** Of this rig alone; absent: of all. */
  rigId?: string;
}

/** Every start of a lab in a span: what became of those that were due, and what stands against those to come. */
export async function calendarOf(db: Handle, span: CalendarSpan): Promise<CalendarItem[]> {
  const { labId, timeZone, fromUtcMs, untilUtcMs, rigId } = span;
  const schedules = await allSchedules(db, { labId, rigId });
  if (schedules.length === 0) return [];
  const known = rigId === undefined ? await listRigs(db, labId) : [await findRig(db, labId, rigId)].filter((rig) => rig !== null);
  const rigs = new Map(known.map((rig) => [rig.id, rig]));
  const rooms = await hoursOfRooms(db, { labId, rigId });
  const scheduleIds = schedules.map(({ id }) => id);
  const decided = new Map<string, StartRow>();
  for (const row of await startsBetween(db, labId, { scheduleIds, fromUtcMs, toUtcMs: untilUtcMs }))
    decided.set(startKey(row.scheduleId, row.dueAt), row);
  const items = schedules.flatMap((schedule) => {
    const rig = rigs.get(schedule.rigId) as RigRecord;
    const known = rooms.get(rig.id);
    const room = { document: rig.document, hours: known?.hours ?? openHours, timeZone };
    const changedAt = Math.max(schedule.stateChangedAt ?? 0, known?.changedAt ?? 0);
    return occurrencesBetween(schedule.plan, timeZone, { afterUtcMs: Math.max(fromUtcMs, schedule.madeAt) - 1, untilUtcMs })
      .map((occurrence) => itemOf(schedule, { occurrence, room, changedAt, row: decided.get(startKey(schedule.id, occurrence.dueUtcMs)) }))
      .filter((item) => item !== null);
  });
  return items.sort((a, b) => a.dueAt.localeCompare(b.dueAt) || a.rigName.localeCompare(b.rigName));
}

const startKey = (scheduleId: string, dueUtcMs: number) => `${scheduleId} ${String(dueUtcMs)}`;

interface StartParts {
  occurrence: Occurrence;
  room: Room;
  /** When its schedule or the hours of its room were changed last, UTC ms; 0: never. */
  changedAt: number;
  row: StartRow | undefined;
}

/** Null for what will never be: a start after the end of its schedule, or one that passed while it was paused. */
function itemOf(schedule: ScheduleRecord, { occurrence: { dueUtcMs, remark }, room, changedAt, row }: StartParts): CalendarItem | null {
  const stay = stayOf(schedule, room, dueUtcMs);
  const item = {
    scheduleId: schedule.id,
    rigId: schedule.rigId,
    rigName: schedule.rigName,
    protocolName: schedule.protocolName,
    protocolRevision: schedule.protocolRevision,
    dueAt: isoOf(dueUtcMs),
    endsAt: isoOf(stay.endUtcMs),
    remark,
    // A start that was taken has the id of a run that is not there yet.
    runId: row?.outcome === 'started' ? row.runId : null,
    changedAt: isoOrNull(Math.max(changedAt, row?.decidedAt ?? 0) || null),
  };
  if (row?.outcome != null) return { ...item, state: row.outcome === 'taken' ? 'planned' : row.outcome, why: row.why };
  if (dueUtcMs <= schedule.decidedUntilAt || schedule.state === 'ended') return null;
  if (schedule.state === 'paused') return { ...item, state: 'paused', why: '' };
  const why = againstRoom(room.hours, stay, room.timeZone);
  return { ...item, state: why === null ? 'planned' : 'blocked', why: why ?? '' };
}
