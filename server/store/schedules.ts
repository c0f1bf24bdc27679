import { and, asc, eq, ne } from 'drizzle-orm';
import { calendarFeeds, labs, massSets, memberships, protocolRevisions, protocols, rigs, roomHours, schedules } from '@/db/schema';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { openHours, type RoomHours, type SchedulePlan } from '@/shared/schedule/plan';
import { one, type Handle } from './database';
import type { Maker } from './rigs';

export type ScheduleRow = typeof schedules.$inferSelect;

/** A schedule with what it would run. */
export interface ScheduleRecord extends ScheduleRow {
  /** IANA zone of the lab, in which its times of day are meant. */
  timeZone: string;
  rigName: string;
  protocolName: string;
  protocol: ProtocolDocument;
  massSetLabel: string;
  sources: RigDocument['sources'];
}

const scheduleQuery = (db: Handle) =>
  db
    .select({
      schedule: schedules,
      timeZone: labs.timeZone,
      rigName: rigs.name,
      protocolName: protocols.name,
      protocol: protocolRevisions.document,
      massSetLabel: massSets.label,
      sources: massSets.sources,
    })
    .from(schedules)
    .innerJoin(labs, eq(labs.id, schedules.labId))
    .innerJoin(rigs, and(eq(rigs.labId, schedules.labId), eq(rigs.id, schedules.rigId)))
    .innerJoin(protocols, and(eq(protocols.labId, schedules.labId), eq(protocols.id, schedules.protocolId)))
    .innerJoin(massSets, and(eq(massSets.labId, schedules.labId), eq(massSets.id, schedules.massSetId)))
    .innerJoin(
      protocolRevisions,
      and(
        eq(protocolRevisions.labId, schedules.labId),
        eq(protocolRevisions.protocolId, schedules.protocolId),
        eq(protocolRevisions.number, schedules.protocolRevision),
      ),
    );

const recordOf = ({ schedule, ...rest }: { schedule: ScheduleRow } & Omit<ScheduleRecord, keyof ScheduleRow>): ScheduleRecord => ({
  ...schedule,
  ...rest,
});

/** Schedules that have not ended, of one lab or of all labs. */
export async function standingSchedules(db: Handle, labId?: string): Promise<ScheduleRecord[]> {
  const rows = await scheduleQuery(db)
    .where(and(ne(schedules.state, 'ended'), labId === undefined ? undefined : eq(schedules.labId, labId)))
    .orderBy(asc(schedules.labId), asc(schedules.madeAt), asc(schedules.id));
  return rows.map(recordOf);
}

/** Of one rig alone; without `rigId` of all of the lab. */
export interface OfLabOrRig {
  labId: string;
  rigId?: string | undefined;
}

/** Schedules of a lab or of one of its rigs, ended ones too: what they started is still in the calendar. */
export async function allSchedules(db: Handle, { labId, rigId }: OfLabOrRig): Promise<ScheduleRecord[]> {
  const rows = await scheduleQuery(db)
    .where(and(eq(schedules.labId, labId), rigId === undefined ? undefined : eq(schedules.rigId, rigId)))
    .orderBy(asc(schedules.madeAt), asc(schedules.id));
  return rows.map(recordOf);
}

/** A schedule, ended or not. */
export async function findSchedule(db: Handle, labId: string, scheduleId: string): Promise<ScheduleRecord | null> {
  const [row] = await scheduleQuery(db).where(and(eq(schedules.labId, labId), eq(schedules.id, scheduleId)));
  return row === undefined ? null : recordOf(row);
}

export interface NewSchedule {
  labId: string;
  rigId: string;
  protocolId: string;
  protocolRevision: number;
  massSetId: string;
  plan: SchedulePlan;
  notes: string;
}

export async function insertSchedule(db: Handle, schedule: NewSchedule, maker: Maker): Promise<string> {
  const row = { ...schedule, decidedUntilAt: maker.at, madeById: maker.userId, madeBy: maker.name, madeAt: maker.at };
  return one(await db.insert(schedules).values(row).returning({ id: schedules.id })).id;
}

/** False where it has ended or is in that state already. */
export async function changeScheduleState(
  db: Handle,
  { labId, scheduleId }: { labId: string; scheduleId: string },
  { state, nowUtcMs }: { state: ScheduleRow['state']; nowUtcMs: number },
): Promise<boolean> {
  const own = and(eq(schedules.labId, labId), eq(schedules.id, scheduleId));
  const changed = await db
    .update(schedules)
    .set({ state, stateChangedAt: nowUtcMs })
    .where(and(own, ne(schedules.state, 'ended'), ne(schedules.state, state)));
  return changed.rowCount === 1;
}

export async function setDecidedUntil(db: Handle, { labId, id }: Pick<ScheduleRow, 'labId' | 'id'>, utcMs: number): Promise<void> {
  await db
    .update(schedules)
    .set({ decidedUntilAt: utcMs })
    .where(and(eq(schedules.labId, labId), eq(schedules.id, id)));
}

/** Hours of the rooms of a lab's rigs, by rig, and since when they are so; a rig without a row has no limits. */
export async function hoursOfRooms(
  db: Handle,
  { labId, rigId: ofRig }: OfLabOrRig,
): Promise<ReadonlyMap<string, { hours: RoomHours; changedAt: number }>> {
  const { rigId, hours, changedAt } = roomHours;
  const rows = await db
    .select({ rigId, hours, changedAt })
    .from(roomHours)
    .where(and(eq(roomHours.labId, labId), ofRig === undefined ? undefined : eq(rigId, ofRig)));
  return new Map(rows.map((row) => [row.rigId, row]));
}

export async function hoursOfRoom(db: Handle, { labId, rigId }: { labId: string; rigId: string }): Promise<RoomHours> {
  return (await hoursOfRooms(db, { labId, rigId })).get(rigId)?.hours ?? openHours;
}

export async function setRoomHours(
  db: Handle,
  { hours, ...rig }: { labId: string; rigId: string; hours: RoomHours },
  maker: Maker,
): Promise<void> {
  const row = { hours, changedAt: maker.at, changedBy: maker.name };
  await db
    .insert(roomHours)
    .values({ ...rig, ...row })
    .onConflictDoUpdate({ target: [roomHours.labId, roomHours.rigId], set: row });
}

/** Gives an account a new secret calendar address; the one before ends. */
export async function putFeed(db: Handle, feed: { labId: string; userId: string; tokenHash: string; madeAt: number }): Promise<void> {
  const { tokenHash, madeAt } = feed;
  await db
    .insert(calendarFeeds)
    .values(feed)
    .onConflictDoUpdate({ target: [calendarFeeds.labId, calendarFeeds.userId], set: { tokenHash, madeAt } });
}

const feedOfUser = (labId: string, userId: string) => and(eq(calendarFeeds.labId, labId), eq(calendarFeeds.userId, userId));

export async function feedOf(db: Handle, labId: string, userId: string): Promise<{ madeAt: number } | null> {
  const [row] = await db.select({ madeAt: calendarFeeds.madeAt }).from(calendarFeeds).where(feedOfUser(labId, userId));
  return row ?? null;
}

export async function deleteFeed(db: Handle, labId: string, userId: string): Promise<void> {
  await db.delete(calendarFeeds).where(feedOfUser(labId, userId));
}

/** The lab that a secret address shows; null where there is none, or where whom it was given to is no member any more. */
export async function labOfFeed(db: Handle, tokenHash: string): Promise<{ labId: string; labName: string; timeZone: string } | null> {
  const [row] = await db
    .select({ labId: labs.id, labName: labs.name, timeZone: labs.timeZone })
    .from(calendarFeeds)
    .innerJoin(memberships, and(eq(memberships.labId, calendarFeeds.labId), eq(memberships.userId, calendarFeeds.userId)))
    .innerJoin(labs, eq(labs.id, calendarFeeds.labId))
    .where(eq(calendarFeeds.tokenHash, tokenHash));
  return row ?? null;
}
