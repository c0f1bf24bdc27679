import { uptime } from 'node:os';
import { performance } from 'node:perf_hooks';
import { SteadyUtc } from '../engine/steady-utc';
import type { Cancel, Clock } from '../interfaces/clock';

/** The machine's clocks: the only place of the server, with the rest of `boot`, where time comes from outside. */
export class RealClock implements Clock {
  /** UTC less monotonic time, ms. */
  private aheadMs = -Infinity;
  private goesOn: () => boolean = () => false;
  private readonly steady = new SteadyUtc(
    () => this.goesOn(),
    // Linux counts sleep in the one and not in the other (clock_gettime(2): CLOCK_BOOTTIME, CLOCK_MONOTONIC).
    () => 1000 * uptime() - performance.now(),
  );

  monotonicMs(): number {
    return performance.now();
  }

  /** Whoever drives runs says whether one goes on: until none does, a wall clock that is set is not followed. */
  keepSteadyWhile(goesOn: () => boolean): void {
    this.goesOn = goesOn;
  }

  utcMs(): number {
    const { monotonicMs, aheadMs } = this.look();
    return monotonicMs + this.steady.aheadMs(aheadMs);
  }

  wallUtcMs(): number {
    const { monotonicMs, aheadMs } = this.look();
    return monotonicMs + aheadMs;
  }

  /** With fraction: the wall clock counts whole milliseconds, so UTC is as far ahead of monotonic time as it was at its greatest. */
  private look(): { monotonicMs: number; aheadMs: number } {
    const monotonicMs = performance.now();
    const aheadMs = Date.now() - monotonicMs;
    // A thread that was kept waiting between the two has not seen one moment of both.
    if (this.aheadMs > -Infinity && performance.now() - monotonicMs > stepMs) return { monotonicMs, aheadMs: this.aheadMs };
    const stepped = aheadMs < this.aheadMs - stepMs;
    if (aheadMs > this.aheadMs || stepped) this.aheadMs = aheadMs;
    return { monotonicMs, aheadMs: this.aheadMs };
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
