import { HOST_STEP_MS } from '../interfaces/clock';

/** A machine that sleeps stops its monotonic time; shorter than this it is taken for awake, ms. */
const LEAST_SLEEP_MS = 2_000;

/**
 * UTC as runs count by it. While one goes on, a wall clock that is set makes no step longer or shorter, and no log that goes back: the run keeps to the time
 * that it began with. A slow correction is followed, and so is what the machine slept.
 */
export class SteadyUtc {
  private lastMs: number | null = null;
  private heldBackMs = 0;
  private sleptMs = 0;

  /** `slept`: how long the machine has slept since it was switched on, ms. */
  constructor(
    private readonly goesOn: () => boolean,
    private readonly slept: () => number = () => 0,
  ) {
    this.sleptMs = slept();
  }

  /** How far UTC is ahead of monotonic time, ms. `wallMs`: by the wall clock; to be told twice a second, so that a slow correction is no jump. */
  aheadMs(wallMs: number): number {
    const byMs = this.lastMs === null ? 0 : wallMs - this.lastMs;
    this.lastMs = wallMs;
    const jumped = Math.abs(byMs) > HOST_STEP_MS;
    if ((jumped || this.heldBackMs !== 0) && !this.goesOn()) this.heldBackMs = 0;
    else if (jumped) this.heldBackMs += byMs - this.sleptMeanwhile();
    return wallMs - this.heldBackMs;
  }

  private sleptMeanwhile(): number {
    const byMs = this.slept() - this.sleptMs;
    if (byMs < LEAST_SLEEP_MS) return 0;
    this.sleptMs += byMs;
    return byMs;
  }
}
