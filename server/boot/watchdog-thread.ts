import { writeSync } from 'node:fs';
import { workerData } from 'node:worker_threads';
import { SEATS, type WatchdogSetting } from './watchdog';

const LOOK_MS = 250;

/** How late the loop is now: by its last beat, or by the one that it still owes. */
function lagMs(seats: Float64Array): number {
  const silentMs = performance.timeOrigin + performance.now() - (seats[SEATS.beatMs] ?? 0);
  return Math.max(seats[SEATS.lateMs] ?? 0, silentMs);
}

/** Counts what it sees itself: a process that was frozen as a whole, this thread too, is not slow when it goes on. */
function watch({ shared, slowMs, longestMs }: WatchdogSetting): void {
  const seats = new Float64Array(shared);
  let slowLooks = 0;
  setInterval(() => {
    slowLooks = lagMs(seats) > slowMs ? slowLooks + 1 : 0;
    if (slowLooks * LOOK_MS < longestMs) return;
    const seconds = (lagMs(seats) / 1000).toFixed(1);
    writeSync(
      2,
      `The event loop lags by ${seconds} s, for more than ${longestMs / 1000} s: this process ends, so that its rigs are held.\n`,
    );
    process.kill(process.pid, 'SIGKILL');
  }, LOOK_MS);
}

if (workerData !== null) watch(workerData as WatchdogSetting);
