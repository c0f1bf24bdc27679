import { and, asc, count, eq, gt, inArray } from 'drizzle-orm';
import { labs, memberships, sessions, users } from '@/db/schema';
import type { Role } from '@/shared/contracts/roles';
import { one, type Database, type Handle, type Transaction } from './database';

export type User = typeof users.$inferSelect;

/** Addresses are kept and compared in lower case. */
export const normalEmail = (email: string): string => email.trim().toLowerCase();

/** A new account, or null when the address has one already. */
export async function createUser(
  db: Handle,
  account: { name: string; email: string; passwordHash: string; demo?: boolean; nowUtcMs: number },
): Promise<User | null> {
  const { nowUtcMs, ...fields } = account;
  const rows = await db
    .insert(users)
    .values({ ...fields, email: normalEmail(fields.email), createdAt: nowUtcMs })
    .onConflictDoNothing({ target: users.email })
    .returning();
  return rows[0] ?? null;
}

export async function userByEmail(db: Handle, email: string): Promise<User | null> {
  const rows = await db
    .select()
    .from(users)
    .where(eq(users.email, normalEmail(email)));
  return rows[0] ?? null;
}

export async function userById(db: Handle, userId: string): Promise<User | null> {
  const rows = await db.select().from(users).where(eq(users.id, userId));
  return rows[0] ?? null;
}

export async function setPasswordHash(db: Handle, userId: string, passwordHash: string): Promise<void> {
  await db.update(users).set({ passwordHash }).where(eq(users.id, userId));
}

const membershipColumns = { labId: labs.id, labName: labs.name, timeZone: labs.timeZone, role: memberships.role };

/** Labs of an account in alphabetical order. */
export function membershipsOf(db: Handle, userId: string) {
  return db
    .select(membershipColumns)
    .from(memberships)
    .innerJoin(labs, eq(labs.id, memberships.labId))
    .where(eq(memberships.userId, userId))
    .orderBy(asc(labs.name), asc(labs.id));
}

async function membershipIn(db: Handle, userId: string, labId: string) {
  const rows = await db
    .select(membershipColumns)
    .from(memberships)
    .innerJoin(labs, eq(labs.id, memberships.labId))
    .where(and(eq(memberships.userId, userId), eq(memberships.labId, labId)));
  return rows[0] ?? null;
}

export interface Member {
  userId: string;
  name: string;
  email: string;
  role: Role;
  /** UTC ms. */
  since: number;
}

const memberColumns = { userId: users.id, name: users.name, email: users.email, role: memberships.role, since: memberships.since };

/** Members of a lab, the longest first. */
export function membersOf(db: Handle, labId: string): Promise<Member[]> {
  return db
    .select(memberColumns)
    .from(memberships)
    .innerJoin(users, eq(users.id, memberships.userId))
    .where(eq(memberships.labId, labId))
    .orderBy(asc(memberships.since), asc(users.name));
}

export async function memberOf(db: Handle, labId: string, userId: string): Promise<Member | null> {
  const rows = await db
    .select(memberColumns)
    .from(memberships)
    .innerJoin(users, eq(users.id, memberships.userId))
    .where(and(eq(memberships.labId, labId), eq(memberships.userId, userId)));
  return rows[0] ?? null;
}

/** False when the account is a member already. */
export async function addMember(db: Handle, member: { labId: string; userId: string; role: Role; nowUtcMs: number }): Promise<boolean> {
  const { nowUtcMs, ...fields } = member;
  const rows = await db
    .insert(memberships)
    .values({ ...fields, since: nowUtcMs })
    .onConflictDoNothing()
    .returning({ role: memberships.role });
  return rows.length === 1;
}

export type MemberChange = 'done' | 'unknown' | 'last-owner';

/**
 * Gives a member another role, or removes it (`role` null). A lab keeps at least one owner: the lab's row is locked
 * meanwhile, so that two owners who demote each other at the same time cannot both succeed.
 */
export async function changeMember(tx: Transaction, change: { labId: string; userId: string; role: Role | null }): Promise<MemberChange> {
  const { labId, userId, role } = change;
  await tx.select({ id: labs.id }).from(labs).where(eq(labs.id, labId)).for('update');
  const member = await memberOf(tx, labId, userId);
  if (member === null) return 'unknown';
  if (member.role === 'owner' && role !== 'owner') {
    const { owners } = one(
      await tx
        .select({ owners: count() })
        .from(memberships)
        .where(and(eq(memberships.labId, labId), eq(memberships.role, 'owner'))),
    );
    if (owners < 2) return 'last-owner';
  }
  const own = and(eq(memberships.labId, labId), eq(memberships.userId, userId));
  if (role === null) await tx.delete(memberships).where(own);
  else await tx.update(memberships).set({ role }).where(own);
  return 'done';
}

/** Memberships, for each request, and with them the living sessions and accounts, for the memory copy of labs with a run. */
export function accessSource(db: Database, nowUtcMs: () => number) {
  return {
    membership: (userId: string, labId: string) => membershipIn(db, userId, labId),
    ofLabs: async (labIds: readonly string[]) => {
      const found = await db
        .select({ ...membershipColumns, userId: memberships.userId })
        .from(memberships)
        .innerJoin(labs, eq(labs.id, memberships.labId))
        .where(inArray(memberships.labId, [...labIds]));
      const userIds = [...new Set(found.map((row) => row.userId))];
      const living = await db
        .select()
        .from(sessions)
        .where(and(inArray(sessions.userId, userIds), gt(sessions.endsAt, nowUtcMs())));
      return {
        memberships: found,
        users: await db.select({ id: users.id, name: users.name, email: users.email }).from(users).where(inArray(users.id, userIds)),
        sessions: living.map((row) => ({
          id: row.id,
          userId: row.userId,
          createdAt: new Date(row.createdAt),
          authAt: new Date(row.authAt),
          expiresAt: row.expiresAt,
        })),
      };
    },
  };
}
