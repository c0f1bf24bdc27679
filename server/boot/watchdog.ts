import { Worker } from 'node:worker_threads';
import { threadOf } from './worker-tasks';

/** Seats of the shared memory: what the loop says of itself, in whole milliseconds of the process' monotonic clock. */
export const SEATS = { beatMs: 0, lateMs: 1 } as const;

export interface WatchdogSetting {
  shared: SharedArrayBuffer;
  /** A loop that is later than this is slow, ms. */
  slowMs: number;
  /** A loop that has been slow for so long is given up, ms. */
  longestMs: number;
}

const BEAT_MS = 100;

/**
 * Watches the event loop from a thread of its own: one that lags for longer than that cannot drive a rig. The process
 * ends at once; its leases lapse, the controller holds, and another process takes the rigs over.
 */
export function startWatchdog(limits: Omit<WatchdogSetting, 'shared'>): { stop(): Promise<void> } {
  const shared = new SharedArrayBuffer(2 * Float64Array.BYTES_PER_ELEMENT);
  const seats = new Float64Array(shared);
  let dueMs = performance.now() + BEAT_MS;
  const beat = () => {
    const nowMs = performance.now();
    seats[SEATS.lateMs] = nowMs - dueMs;
    seats[SEATS.beatMs] = performance.timeOrigin + nowMs;
    dueMs = nowMs + BEAT_MS;
  };
  beat();
  const timer = setInterval(beat, BEAT_MS);
  timer.unref();
  const worker = new Worker(threadOf('watchdog-thread'), { eval: true, execArgv: [], workerData: { ...limits, shared } });
  worker.unref();
  return {
    stop: async () => {
      clearInterval(timer);
      await worker.terminate();
    },
  };
}
