/**
 * The driver's side of the motion lease (SPEC 10): renewed only while the run loop says so, not from the first stop
 * on until the next motion is ordered (SPEC 9.6), and taken for live only on the controller's word.
 */
export class Lease {
  private rule: () => boolean = () => false;
  private quiet = false;
  private confirmedMs = -Infinity;

  setRule(mayRenew: () => boolean): void {
    this.rule = mayRenew;
  }

  mayRenew(): boolean {
    return !this.quiet && this.rule();
  }

  /** A renewal that was written at `sentMs` is confirmed. */
  confirm(sentMs: number): void {
    this.confirmedMs = sentMs;
  }

  /** Live for long enough that a motion ordered now will find it so. */
  isFresh(nowMs: number): boolean {
    return nowMs - this.confirmedMs < FRESH_MS;
  }

  /** Ended by the controller (SPEC 10.3), or not to be trusted any more. */
  end(): void {
    this.confirmedMs = -Infinity;
  }

  stopRenewing(): void {
    this.quiet = true;
    this.end();
  }

  wanted(): void {
    this.quiet = false;
  }
}

/** Half of the lease's life (SPEC 10.1). */
const FRESH_MS = 1000;
