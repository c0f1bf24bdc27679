import { performance } from 'node:perf_hooks';
import type { Cancel, Clock } from '../interfaces/clock';

/** The machine's clocks: the only place of the server, with the rest of `boot`, where time comes from outside. */
export class RealClock implements Clock {
  monotonicMs(): number {
    return performance.now();
  }

  utcMs(): number {
    return Date.now();
  }

  after(delayMs: number, task: () => void): Cancel {
    const timer = setTimeout(task, Math.min(Math.max(0, delayMs), longestMs));
    return () => clearTimeout(timer);
  }
}

/** Greater delays overflow Node's timer and would fire at once. */
const longestMs = 2_147_483_647;
