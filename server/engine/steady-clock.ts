import { type Cancel, type Clock, HOST_STEP_MS } from '../interfaces/clock';

/** A machine that sleeps stops its monotonic time; shorter than this it is taken for awake, ms. */
const LEAST_SLEEP_MS = 2_000;
/** A thread that was kept waiting for longer between its looks at two clocks has not seen one moment of both, ms. */
const ONE_MOMENT_MS = 1;

/**
 * The time that the run of a rig keeps to. While it goes on, a wall clock that is set makes no step longer or shorter, and no log that goes back. A slow
 * correction is followed, and so is what the machine slept. All else in the server goes by the wall clock.
 */
export class SteadyClock implements Clock {
  private lastAheadMs: number | null = null;
  private heldBackMs = 0;
  /** Whether a run went on at the last look. */
  private wentOn = false;
  private sleptMs: number;

  /** `slept`: how long the machine has slept since it was switched on, ms. */
  constructor(
    private readonly wall: Clock,
    private readonly goesOn: () => boolean,
    private readonly slept: () => number = () => 0,
  ) {
    this.sleptMs = slept();
  }

  monotonicMs(): number {
    return this.wall.monotonicMs();
  }

  after(delayMs: number, task: () => void): Cancel {
    return this.wall.after(delayMs, task);
  }

  /** To be asked twice a second, so that a slow correction is no jump. */
  utcMs(): number {
    const monotonicMs = this.wall.monotonicMs();
    const utcMs = this.wall.utcMs();
    if (this.wall.monotonicMs() - monotonicMs <= ONE_MOMENT_MS) this.look(utcMs - monotonicMs);
    return utcMs - this.heldBackMs;
  }

  wallUtcMs(): number {
    return this.wall.utcMs();
  }

  private look(aheadMs: number): void {
    const byMs = this.lastAheadMs === null ? 0 : aheadMs - this.lastAheadMs;
    this.lastAheadMs = aheadMs;
    const [began, goesOn] = [!this.wentOn, this.goesOn()];
    this.wentOn = goesOn;
    const jumped = Math.abs(byMs) > HOST_STEP_MS;
    const sleptMs = jumped ? this.sleptMeanwhile() : 0;
    // What came before a run, or between two looks of which only one saw it, is none of its own.
    if (!goesOn || began) this.heldBackMs = 0;
    else if (jumped) this.heldBackMs += byMs - sleptMs;
  }

  private sleptMeanwhile(): number {
    const byMs = this.slept() - this.sleptMs;
    if (byMs < LEAST_SLEEP_MS) return 0;
    this.sleptMs += byMs;
    return byMs;
  }
}
