import type { Cancel, Clock } from '../interfaces/clock';

export interface TimerEvents {
  /** At or after the deadline, UTC ms. */
  deadline(utcMs: number): void;
  beat(): void;
  alive(): void;
}

/** The loop says that it lives twice a second while something may move, and every 30 s in the database. */
const BEAT_MS = 500;
export const ALIVE_MS = 30_000;
/** A wall clock may step: a far deadline is looked at again at least this often. */
const LONGEST_WAIT_MS = 60_000;

/** The three timers of a run. All they do is to put something into its inbox: what is stuck there stays unsaid. */
export class RunTimers {
  private readonly cancels: Partial<Record<keyof TimerEvents, Cancel>> = {};
  private closed = false;

  constructor(
    private readonly clock: Clock,
    private readonly events: TimerEvents,
  ) {}

  /** Replaces the deadline; null: nothing is awaited by time. */
  awaitDeadline(utcMs: number | null): void {
    this.cancels.deadline?.();
    if (utcMs === null || this.closed) return;
    const leftMs = utcMs - this.clock.utcMs();
    this.cancels.deadline = this.clock.after(Math.min(leftMs, LONGEST_WAIT_MS), () => {
      if (utcMs - this.clock.utcMs() > 0.5) this.awaitDeadline(utcMs);
      else this.events.deadline(Math.max(this.clock.utcMs(), utcMs));
    });
  }

  /** One beat, half a second from now, unless one is on its way. */
  awaitBeat(): void {
    if (this.cancels.beat !== undefined || this.closed) return;
    this.cancels.beat = this.clock.after(BEAT_MS, () => {
      delete this.cancels.beat;
      this.events.beat();
    });
  }

  keepAlive(): void {
    if (this.closed) return;
    this.cancels.alive = this.clock.after(ALIVE_MS, () => {
      this.events.alive();
      this.keepAlive();
    });
  }

  close(): void {
    this.closed = true;
    for (const cancel of Object.values(this.cancels)) cancel();
  }
}
