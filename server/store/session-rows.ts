import { DrizzlePostgreSQLAdapter } from '@lucia-auth/adapter-drizzle';
import { eq, lte } from 'drizzle-orm';
import { memberships, sessions, users } from '@/db/schema';
import type { Role } from '@/shared/contracts/roles';
import type { Database } from './database';

/** What is known of a session besides its id and its account; instants in UTC ms. */
export interface SessionFacts {
  createdAt: number;
  authAt: number;
  /** End of the absolute limit. */
  endsAt: number;
  userAgent: string;
  ip: string;
}

/** Lucia's view of the session and account tables. */
export const sessionAdapter = (db: Database) => new DrizzlePostgreSQLAdapter(db, sessions, users);

/** The roles an account has anywhere. */
export async function rolesOf(db: Database, userId: string): Promise<Role[]> {
  const rows = await db.selectDistinct({ role: memberships.role }).from(memberships).where(eq(memberships.userId, userId));
  return rows.map((row) => row.role);
}

/** Removes sessions past their absolute limit; returns how many. */
export async function sweepSessions(db: Database, nowUtcMs: number): Promise<number> {
  const gone = await db.delete(sessions).where(lte(sessions.endsAt, nowUtcMs));
  return gone.rowCount ?? 0;
}
