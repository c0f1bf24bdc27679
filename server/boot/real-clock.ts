import { performance } from 'node:perf_hooks';
import type { Cancel, Clock } from '../interfaces/clock';

/** The machine's clocks: the only place of the server, with the rest of `boot`, where time comes from outside. */
export class RealClock implements Clock {
  /** UTC less monotonic time, ms. */
  private aheadMs = -Infinity;

  monotonicMs(): number {
    return performance.now();
  }

  /** With fraction: the wall clock counts whole milliseconds, so UTC is as far ahead of monotonic time as it was at its greatest. */
  utcMs(): number {
    const monotonicMs = performance.now();
    const aheadMs = Date.now() - monotonicMs;
    const stepped = aheadMs < this.aheadMs - stepMs;
    if (aheadMs > this.aheadMs || stepped) this.aheadMs = aheadMs;
    return monotonicMs + this.aheadMs;
  }

  after(delayMs: number, task: () => void): Cancel {
    const timer = setTimeout(task, Math.min(Math.max(0, delayMs), longestMs));
    return () => clearTimeout(timer);
  }
}

/** A wall clock that falls back by more than its own resolution was set, or is being slewed. */
const stepMs = 1.5;
/** Greater delays overflow Node's timer and would fire at once. */
const longestMs = 2_147_483_647;
