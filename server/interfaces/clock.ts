/**
 * The server's clocks. Monotonic time measures durations and deadlines; UTC labels instants. Only `server/boot`
 * builds a real one; tests and rehearsals use `FakeClock`.
 */
export interface Clock {
  /** Milliseconds since an arbitrary origin, never stepping. */
  monotonicMs(): number;
  /** Milliseconds since 1970-01-01T00:00:00Z, with fraction. */
  utcMs(): number;
  /** By the wall clock, where `utcMs` does not follow one that is set; absent where it does. */
  wallUtcMs?(): number;
  /** Runs `task` once, `delayMs` of monotonic time from now (0 or less: as soon as possible, never synchronously). */
  after(delayMs: number, task: () => void): Cancel;
}

/** Between two looks at the host's clocks, half a second apart, UTC moves by no more than this unless it is set. */
export const HOST_STEP_MS = 20;

export const wallUtcMs = (clock: Clock): number => clock.wallUtcMs?.() ?? clock.utcMs();

export type Cancel = () => void;

/** An instant in UTC with its standard uncertainty. */
export interface Instant {
  utcMs: number;
  /** Standard uncertainty (k = 1), s. */
  uS: number;
}
