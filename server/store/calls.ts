import { and, desc, eq, gte, isNotNull } from 'drizzle-orm';
import { alarmHops, labCalls, labs, memberships, ownCalls, users } from '@/db/schema';
import { usualCallSettings, type CallSettings, type OwnCall } from '@/shared/alarms/settings';
import type { Handle } from './database';

/** Whom a lab's alarms ring, what was rung, and the outside watcher. */

export async function callSettingsOf(db: Handle, labId: string): Promise<CallSettings> {
  const [row] = await db.select({ settings: labCalls.settings }).from(labCalls).where(eq(labCalls.labId, labId));
  return row?.settings ?? usualCallSettings;
}

export async function alarmTimes(db: Handle, labId: string): Promise<{ morningAt: string; timeZone: string; labName: string }> {
  const [lab] = await db.select({ timeZone: labs.timeZone, name: labs.name }).from(labs).where(eq(labs.id, labId));
  const { morningAt } = await callSettingsOf(db, labId);
  return { morningAt, timeZone: lab?.timeZone ?? 'UTC', labName: lab?.name ?? '' };
}

export async function putCallSettings(db: Handle, labId: string, settings: CallSettings): Promise<void> {
  await db.insert(labCalls).values({ labId, settings }).onConflictDoUpdate({ target: labCalls.labId, set: { settings } });
}

export interface CallMember {
  userId: string;
  name: string;
  email: string;
  role: string;
  doNotRing: OwnCall['doNotRing'];
}

/** Members of the lab with what they set for themselves. */
export async function callMembersOf(db: Handle, labId: string): Promise<CallMember[]> {
  const rows = await db
    .select({ userId: users.id, name: users.name, email: users.email, role: memberships.role, own: ownCalls.own })
    .from(memberships)
    .innerJoin(users, eq(users.id, memberships.userId))
    .leftJoin(ownCalls, and(eq(ownCalls.labId, memberships.labId), eq(ownCalls.userId, memberships.userId)))
    .where(eq(memberships.labId, labId))
    .orderBy(memberships.since, users.name);
  return rows.map(({ own, ...member }) => ({ ...member, doNotRing: own?.doNotRing ?? null }));
}

export async function putOwnCall(db: Handle, who: { labId: string; userId: string }, own: OwnCall): Promise<void> {
  await db
    .insert(ownCalls)
    .values({ ...who, own })
    .onConflictDoUpdate({ target: [ownCalls.labId, ownCalls.userId], set: { own } });
}

export type AlarmHop = typeof alarmHops.$inferInsert;
export type AlarmHopRow = typeof alarmHops.$inferSelect;

export async function writeHops(db: Handle, hops: readonly AlarmHop[]): Promise<void> {
  if (hops.length > 0) await db.insert(alarmHops).values([...hops]);
}

/** All messages for an alarm, newest first. */
export const hopsOfAlarm = (db: Handle, labId: string, alarmId: string): Promise<AlarmHopRow[]> =>
  db
    .select()
    .from(alarmHops)
    .where(and(eq(alarmHops.labId, labId), eq(alarmHops.alarmId, alarmId)))
    .orderBy(desc(alarmHops.seq))
    .limit(200);

/** Messages of one occurrence. */
export const hopsOfOccurrence = (db: Handle, { labId, alarmId, occurrence }: { labId: string; alarmId: string; occurrence: number }) =>
  db
    .select()
    .from(alarmHops)
    .where(and(eq(alarmHops.labId, labId), eq(alarmHops.alarmId, alarmId), eq(alarmHops.occurrence, occurrence)))
    .orderBy(alarmHops.seq);

/** Messages of a lab since then that reached somebody. */
export async function reachedSince(
  db: Handle,
  labId: string,
  sinceUtcMs: number,
): Promise<{ alarmId: string; occurrence: number; userId: string | null }[]> {
  return db
    .select({ alarmId: alarmHops.alarmId, occurrence: alarmHops.occurrence, userId: alarmHops.userId })
    .from(alarmHops)
    .where(and(eq(alarmHops.labId, labId), gte(alarmHops.at, sinceUtcMs), eq(alarmHops.outcome, 'sent')));
}

export interface Watcher {
  labId: string;
  url: string;
}

/** Labs that have an outside watcher. */
export async function watchers(db: Handle): Promise<Watcher[]> {
  const rows = await db.select({ labId: labCalls.labId, url: labCalls.signUrl }).from(labCalls).where(isNotNull(labCalls.signUrl));
  return rows.map(({ labId, url }) => ({ labId, url: url ?? '' }));
}

export type WatcherState = Pick<typeof labCalls.$inferSelect, 'signUrl' | 'signAt' | 'signOk' | 'signDetail' | 'signFailingSince'>;

export async function watcherOf(db: Handle, labId: string): Promise<WatcherState> {
  const { signUrl, signAt, signOk, signDetail, signFailingSince } = labCalls;
  const [row] = await db.select({ signUrl, signAt, signOk, signDetail, signFailingSince }).from(labCalls).where(eq(labCalls.labId, labId));
  return row ?? { signUrl: null, signAt: null, signOk: null, signDetail: '', signFailingSince: null };
}

/** Another watcher, or none: what was known of the one before does not hold for it. */
export async function putWatcher(db: Handle, labId: string, signUrl: string | null): Promise<void> {
  const fresh = { signUrl, signAt: null, signOk: null, signDetail: '', signFailingSince: null };
  await db
    .insert(labCalls)
    .values({ labId, settings: usualCallSettings, ...fresh })
    .onConflictDoUpdate({ target: labCalls.labId, set: fresh });
}

export async function noteSign(db: Handle, { labId, url }: Watcher, sign: { at: number; ok: boolean; detail: string }): Promise<void> {
  const { at, ok, detail } = sign;
  const [row] = await db.select({ since: labCalls.signFailingSince }).from(labCalls).where(eq(labCalls.labId, labId));
  await db
    .update(labCalls)
    .set({ signAt: at, signOk: ok, signDetail: detail, signFailingSince: ok ? null : (row?.since ?? at) })
    .where(and(eq(labCalls.labId, labId), eq(labCalls.signUrl, url)));
}
