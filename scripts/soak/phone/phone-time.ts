import type { Cancel } from '@/server/interfaces/clock';

/** Time as a phone has it. */
export interface PhoneTime {
  utcMs(): number;
  after(delayMs: number, task: () => void): Cancel;
}

/** The timers and the clock of the program are the phone's while `work` is done. */
export async function asOfThePhone<T>(time: PhoneTime, work: () => Promise<T>): Promise<T> {
  const { setTimeout: timer, clearTimeout: clear } = globalThis;
  const dateNow = Date.now;
  const cancels = new Map<number, Cancel>();
  let made = 0;
  globalThis.setTimeout = ((task: () => void, delayMs = 0) => {
    made += 1;
    cancels.set(made, time.after(delayMs, task));
    return made;
  }) as unknown as typeof setTimeout;
  globalThis.clearTimeout = ((id: number) => cancels.get(id)?.()) as typeof clearTimeout;
  Date.now = () => time.utcMs();
  try {
    return await work();
  } finally {
    globalThis.setTimeout = timer;
    globalThis.clearTimeout = clear;
    Date.now = dateNow;
  }
}
