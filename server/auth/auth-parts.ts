import type { Clock } from '../interfaces/clock';
import type { SessionPort } from '../interfaces/sessions';
import type { Database } from '../store/database';

/** What signing in, resets and invitations work with. */
export interface AuthParts {
  db: Database;
  clock: Pick<Clock, 'utcMs'>;
  sessions: SessionPort;
  /** A fresh secret of 256 bits. */
  newToken(): string;
  /** Hex SHA-256 of UTF-8 text. */
  sha256(text: string): string;
  /** Whether demo accounts may sign in. */
  demo: boolean;
}

/** Where a request comes from. */
export interface Device {
  userAgent: string;
  ip: string;
}

/** Too many tries: come back after so many seconds. */
export interface Wait {
  kind: 'wait';
  seconds: number;
}
