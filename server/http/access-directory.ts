import type { Clock } from '../interfaces/clock';
import type { Session, SessionPort } from '../interfaces/sessions';
import type { Membership, SignedIn } from './route-context';

/** Where memberships are looked up: the database, through `server/store`. */
export interface AccessSource {
  membership(userId: string, labId: string): Promise<Membership | null>;
  /** Sessions within their absolute life and memberships of everybody in these labs, for the memory copy. */
  ofLabs(labIds: readonly string[]): Promise<{
    sessions: Session[];
    users: { id: string; name: string; email: string }[];
    memberships: (Membership & { userId: string })[];
  }>;
}

export type EndedAccess = { sessionId: string } | { userId: string };

interface Copy {
  sessions: Map<string, Session>;
  users: Map<string, { id: string; name: string; email: string }>;
  memberships: Map<string, Membership>;
}

/** A session that idled out may still hold and stop during a run of its lab, but none lives longer than this. */
const absoluteLifeMs = 7 * 24 * 3_600_000;

const membershipKey = (userId: string, labId: string) => `${userId} ${labId}`;
const emptyCopy = (): Copy => ({ sessions: new Map(), users: new Map(), memberships: new Map() });

/**
 * Who is signed in and what they are in a lab. Ordinary routes ask the database each time, so that a changed role
 * holds at once. For hold, stop and personal locks a copy of everybody in the labs whose rigs this process drives is kept in
 * memory: these must work when the database does not.
 */
export class AccessDirectory {
  private copy = emptyCopy();
  private watched: ReadonlySet<string> = new Set();
  private readonly listeners = new Set<(ended: EndedAccess) => void>();
  /** For each look into the database that is under way, the sessions and accounts forgotten since it began: what it finds of them is old. */
  private readonly looks = new Set<Set<string>>();

  constructor(private readonly parts: { source: AccessSource; sessions: SessionPort; clock: Clock; sha256: (text: string) => string }) {}

  /** The signed-in account of a cookie token, or null. */
  async signedIn(token: string): Promise<SignedIn | null> {
    const { found: living, forgotten } = await this.look(() => this.parts.sessions.validate(token));
    if (living === null) return null;
    const { user, ...session } = living;
    if (this.watched.size > 0 && !forgotten.has(session.id) && !forgotten.has(user.id)) {
      this.copy.sessions.set(session.id, session);
      this.copy.users.set(user.id, user);
    }
    return { userId: user.id, name: user.name, email: user.email, session, token };
  }

  /** Role of an account in a lab, or null for a stranger. */
  async membership(userId: string, labId: string): Promise<Membership | null> {
    const { found: membership, forgotten } = await this.look(() => this.parts.source.membership(userId, labId));
    if (membership !== null && this.watched.has(labId) && !forgotten.has(userId))
      this.copy.memberships.set(membershipKey(userId, labId), membership);
    return membership;
  }

  /** Caller and role out of memory alone; null when the copy does not hold them. */
  remembered(token: string, labId: string): { me: SignedIn; membership: Membership } | null {
    const session = this.copy.sessions.get(this.parts.sha256(token));
    if (session === undefined || this.parts.clock.utcMs() - session.createdAt.getTime() > absoluteLifeMs) return null;
    const user = this.copy.users.get(session.userId);
    const membership = this.copy.memberships.get(membershipKey(session.userId, labId));
    if (user === undefined || membership === undefined) return null;
    return { me: { userId: user.id, name: user.name, email: user.email, session, token }, membership };
  }

  /** The session's account out of memory alone, whatever lab it is for; null when the copy does not hold it. */
  rememberedSelf(token: string): SignedIn | null {
    const labIds = [...this.copy.memberships.values()].map(({ labId }) => labId);
    return labIds.map((labId) => this.remembered(token, labId)).find((found) => found !== null)?.me ?? null;
  }

  /** Labs with a rig of this process of which the account is a member, out of memory alone. */
  rememberedMemberships(userId: string): Membership[] {
    return [...this.copy.memberships].flatMap(([key, membership]) => (key.startsWith(`${userId} `) ? [membership] : []));
  }

  /** Takes a fresh copy for these labs; keeps the old one when the database does not answer. */
  async refresh(labIds: readonly string[]): Promise<void> {
    this.watched = new Set(labIds);
    if (labIds.length === 0) {
      this.copy = emptyCopy();
      return;
    }
    const { found, forgotten } = await this.look(() => this.parts.source.ofLabs(labIds));
    const stands = ({ id, userId }: Pick<Session, 'id' | 'userId'>) => !forgotten.has(id) && !forgotten.has(userId);
    const nowMs = this.parts.clock.utcMs();
    const idledOut = [...this.copy.sessions.values()].filter(
      (session) => session.expiresAt.getTime() <= nowMs && nowMs - session.createdAt.getTime() <= absoluteLifeMs,
    );
    this.copy = {
      sessions: new Map([...idledOut, ...found.sessions].filter(stands).map((session) => [session.id, session])),
      users: new Map(found.users.map((user) => [user.id, user])),
      memberships: new Map(
        found.memberships
          .filter(({ userId }) => !forgotten.has(userId))
          .map(({ userId, ...membership }) => [membershipKey(userId, membership.labId), membership]),
      ),
    };
  }

  /** Tells when a session or all of an account's access has ended, so that its streams can be closed. */
  onEnded(listener: (ended: EndedAccess) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  /** Forgets an ended session at once. */
  forgetSession(token: string): void {
    const sessionId = this.parts.sha256(token);
    this.copy.sessions.delete(sessionId);
    for (const look of this.looks) look.add(sessionId);
    for (const listener of this.listeners) listener({ sessionId });
  }

  /** Forgets all that is remembered of an account, after its role, membership or password changed. */
  forgetUser(userId: string): void {
    for (const [id, session] of this.copy.sessions) if (session.userId === userId) this.copy.sessions.delete(id);
    for (const key of this.copy.memberships.keys()) if (key.startsWith(`${userId} `)) this.copy.memberships.delete(key);
    for (const look of this.looks) look.add(userId);
    for (const listener of this.listeners) listener({ userId });
  }

  private async look<T>(into: () => Promise<T>): Promise<{ found: T; forgotten: ReadonlySet<string> }> {
    const forgotten = new Set<string>();
    this.looks.add(forgotten);
    try {
      return { found: await into(), forgotten };
    } finally {
      this.looks.delete(forgotten);
    }
  }
}
