import type { Cancel, Clock } from '../interfaces/clock';
import type { RealClock } from './real-clock';

/** Time that passes `factor` times as fast as the machine's, from the present on: hours of a rig in minutes, with threads and timers as they are. */
export class ScaledClock implements Clock {
  private readonly bornMs: number;
  private readonly bornUtcMs: number;

  constructor(
    private readonly real: RealClock,
    readonly factor: number,
  ) {
    this.bornMs = real.monotonicMs();
    this.bornUtcMs = real.utcMs();
  }

  monotonicMs(): number {
    return (this.real.monotonicMs() - this.bornMs) * this.factor;
  }

  utcMs(): number {
    return this.bornUtcMs + this.monotonicMs();
  }

  after(delayMs: number, task: () => void): Cancel {
    return this.real.after(delayMs / this.factor, task);
  }

  /** The thread's real monotonic time of an instant of this clock. */
  realMs(ms: number): number {
    return this.bornMs + ms / this.factor;
  }

  /** The other way round. */
  ofRealMs(realMs: number): number {
    return (realMs - this.bornMs) * this.factor;
  }
}
