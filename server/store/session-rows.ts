import { DrizzlePostgreSQLAdapter } from '@lucia-auth/adapter-drizzle';
import { eq, lte, sql } from 'drizzle-orm';
import type { DatabaseSession, DatabaseUser } from 'lucia';
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

/** What is known of an account on each request. */
export interface AccountFacts {
  name: string;
  email: string;
  /** Its roles anywhere. */
  roles: Role[];
}

/** Lucia's view of the session and account tables. Every request asks for both and for the roles: all in one query. */
class SessionAdapter extends DrizzlePostgreSQLAdapter {
  constructor(private readonly handle: Database) {
    super(handle, sessions, users);
  }

  override async getSessionAndUser(sessionId: string): Promise<[DatabaseSession | null, DatabaseUser | null]> {
    const roles = sql<Role[]>`array(select distinct ${memberships.role} from ${memberships} where ${memberships.userId} = ${users.id})`;
    const [row] = await this.handle
      .select({ session: sessions, name: users.name, email: users.email, roles })
      .from(sessions)
      .innerJoin(users, eq(sessions.userId, users.id))
      .where(eq(sessions.id, sessionId));
    if (row === undefined) return [null, null];
    const { id, userId, expiresAt, ...attributes } = row.session;
    const account: AccountFacts = { name: row.name, email: row.email, roles: row.roles };
    return [
      { id, userId, expiresAt, attributes: attributes as DatabaseSession['attributes'] },
      { id: userId, attributes: account },
    ];
  }
}

export const sessionAdapter = (db: Database) => new SessionAdapter(db);

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
