import type { BootCause } from '@/firmware-protocol/codec';

const START_US = 1_000_000;

/** The starts of the simulated controller: how many there were, since when it runs, whether one is going on. */
export class SimulatedStart {
  private bootUs: number;
  private pending: { cause: BootCause; doneUs: number } | null = null;

  /** `count`: number of starts so far, which is the boot identifier (SPEC 3.1). */
  constructor(
    public count: number,
    uptimeUs: number,
  ) {
    this.bootUs = -uptimeUs;
  }

  /** When the start that is going on is done, µs; null when none is. */
  get doneUs(): number | null {
    return this.pending?.doneUs ?? null;
  }

  begin(us: number, cause: BootCause): void {
    this.pending = { cause, doneUs: us + START_US };
  }

  /** The start that was going on is done. */
  finish(): { cause: BootCause; atUs: number } | null {
    const { pending } = this;
    if (pending === null) return null;
    this.pending = null;
    this.count += 1;
    this.bootUs = pending.doneUs;
    return { cause: pending.cause, atUs: pending.doneUs };
  }

  /** What the controller's own clock shows. */
  stampUs(us: number): number {
    return Math.max(0, Math.round(us - this.bootUs));
  }

  /** When the controller's own clock shows `stampUs`. */
  usOf(stampUs: number): number {
    return stampUs + this.bootUs;
  }
}
