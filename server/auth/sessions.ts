import { Lucia, TimeSpan, type Adapter, type DatabaseSession } from 'lucia';
import type { Role } from '@/shared/contracts/roles';
import type { Clock } from '../interfaces/clock';
import type { Session, SessionPort } from '../interfaces/sessions';
import type { Database } from '../store/database';
import { rolesOf, sessionAdapter, type AccountFacts, type SessionFacts } from '../store/session-rows';

interface Attributes extends SessionFacts {
  /** End of the idle limit, UTC ms. */
  idleEndsAt: number;
}

declare module 'lucia' {
  interface Register {
    Lucia: Lucia<Attributes, AccountFacts>;
    DatabaseSessionAttributes: Attributes;
    DatabaseUserAttributes: AccountFacts;
  }
}

const hourMs = 3_600_000;
const dayMs = 24 * hourMs;

/** How long a session lasts unused, and at most. Whoever can only look is asked again far less often. */
const limitsOfAct = { idleMs: 12 * hourMs, absoluteMs: 7 * dayMs };
const limitsOfLook = { idleMs: 30 * dayMs, absoluteMs: 90 * dayMs };
const limitsFor = (roles: readonly Role[]) => (roles.length > 0 && roles.every((role) => role === 'viewer') ? limitsOfLook : limitsOfAct);

export interface SessionParts {
  db: Database;
  clock: Pick<Clock, 'utcMs'>;
  /** A fresh secret of 256 bits. */
  newToken(): string;
  /** Hex SHA-256 of UTF-8 text. */
  sha256(text: string): string;
}

/**
 * Sessions by Lucia. Its session id is the SHA-256 of the token, so that the table alone signs nobody in. Lucia reads
 * the system's clock and knows a sliding limit only: it is shown an end it never reaches, and both limits, idle and
 * absolute, are kept here, on the clock that is handed in.
 */
export function createSessions(parts: SessionParts): SessionPort {
  const { db, clock, newToken, sha256 } = parts;
  const lucia = new Lucia(endless(sessionAdapter(db)), {
    sessionExpiresIn: new TimeSpan(1, 'd'),
    getSessionAttributes: (attributes: Attributes) => attributes,
    getUserAttributes: (account: AccountFacts) => account,
  });
  return {
    create: async (userId, device) => {
      const token = newToken();
      const limits = limitsFor(await rolesOf(db, userId));
      const nowMs = clock.utcMs();
      const endsAt = nowMs + limits.absoluteMs;
      const facts = {
        createdAt: nowMs,
        authAt: nowMs,
        endsAt,
        idleEndsAt: nowMs + limits.idleMs,
        userAgent: device.userAgent.slice(0, 300),
        ip: device.ip,
      };
      await lucia.createSession(userId, facts, { sessionId: sha256(token) });
      return { token, expiresAt: new Date(endsAt) };
    },
    validate: async (token) => {
      const { session, user } = await lucia.validateSession(sha256(token));
      if (session === null) return null;
      const living = await withinLimits(parts, session, user.roles);
      return living === null ? null : { ...living, user: { id: user.id, name: user.name, email: user.email } };
    },
    end: (token) => lucia.invalidateSession(sha256(token)),
    endAllOf: (userId) => lucia.invalidateUserSessions(userId),
  };
}

/** The session where it still stands, its idle limit moved on when more than half of it is used up. */
async function withinLimits(
  { db, clock }: SessionParts,
  session: Attributes & { id: string; userId: string },
  roles: readonly Role[],
): Promise<Session | null> {
  const limits = limitsFor(roles);
  const nowMs = clock.utcMs();
  // A role that was raised since shortens the session, one that was lowered does not lengthen it.
  const endsAt = Math.min(session.endsAt, session.createdAt + limits.absoluteMs);
  if (nowMs >= endsAt || nowMs >= session.idleEndsAt) return null;
  const remainingMs = session.idleEndsAt - nowMs;
  const renew = remainingMs < limits.idleMs / 2 || remainingMs > limits.idleMs;
  const idleEndsAt = Math.min(renew ? nowMs + limits.idleMs : session.idleEndsAt, endsAt);
  if (renew) await sessionAdapter(db).updateSessionExpiration(session.id, new Date(idleEndsAt));
  return {
    id: session.id,
    userId: session.userId,
    createdAt: new Date(session.createdAt),
    authAt: new Date(session.authAt),
    expiresAt: new Date(idleEndsAt),
  };
}

const never = new Date(Date.UTC(9999, 0, 1));

/** The adapter with the idle limit carried among the attributes, out of Lucia's own reckoning. */
function endless(adapter: Adapter): Adapter {
  const shown = (session: DatabaseSession): DatabaseSession => ({
    ...session,
    expiresAt: never,
    attributes: { ...session.attributes, idleEndsAt: session.expiresAt.getTime() },
  });
  return {
    getSessionAndUser: async (sessionId) => {
      const [session, user] = await adapter.getSessionAndUser(sessionId);
      return [session === null ? null : shown(session), user];
    },
    getUserSessions: async (userId) => (await adapter.getUserSessions(userId)).map(shown),
    setSession: (session) => {
      const { idleEndsAt, ...facts } = session.attributes;
      return adapter.setSession({ ...session, expiresAt: new Date(idleEndsAt), attributes: facts as Attributes });
    },
    updateSessionExpiration: (sessionId, expiresAt) => adapter.updateSessionExpiration(sessionId, expiresAt),
    deleteSession: (sessionId) => adapter.deleteSession(sessionId),
    deleteUserSessions: (userId) => adapter.deleteUserSessions(userId),
    deleteExpiredSessions: () => adapter.deleteExpiredSessions(),
  };
}
