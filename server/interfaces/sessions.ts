/** Sessions behind a small port: the database holds only the SHA-256 of a token, the cookie holds the token. */
export interface SessionPort {
  /** `expiresAt` is the end of the absolute limit: the life of the cookie. */
  create(userId: string, device: { userAgent: string; ip: string }): Promise<{ token: string; expiresAt: Date }>;
  /** Null when unknown, ended, unused for longer than the idle limit or older than the absolute one. Renews a session that is past half its idle life. */
  validate(token: string): Promise<LivingSession | null>;
  end(token: string): Promise<void>;
  endAllOf(userId: string): Promise<void>;
}

export interface Session {
  id: string;
  userId: string;
  createdAt: Date;
  /** When the password was last given. */
  authAt: Date;
  /** When it ends if it is not used until then. */
  expiresAt: Date;
}

/** A session that stands, and whose it is. */
export interface LivingSession extends Session {
  user: { id: string; name: string; email: string };
}
