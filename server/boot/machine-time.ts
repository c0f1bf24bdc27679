import { RealClock } from './real-clock';
import { ScaledClock } from './scaled-clock';

/** A clock that threads can share: real time, or time that passes faster or slower than it. */
export type ThreadClock = RealClock | ScaledClock;

/** Between a thread's clock and the machine's monotonic one, which all threads share: messages between threads carry instants of the latter, ms. */
export interface MachineTime {
  toMachineMs(ms: number): number;
  fromMachineMs(machineMs: number): number;
}

export function machineTimeOf(clock: ThreadClock): MachineTime {
  const scaled = clock instanceof ScaledClock ? clock : null;
  const realMs = (ms: number) => scaled?.realMs(ms) ?? ms;
  const aheadMs = Number(process.hrtime.bigint()) / 1e6 - realMs(clock.monotonicMs());
  return {
    toMachineMs: (ms) => realMs(ms) + aheadMs,
    fromMachineMs: (machineMs) => scaled?.ofRealMs(machineMs - aheadMs) ?? machineMs - aheadMs,
  };
}

/** How much faster than the machine's a clock's time passes. */
export const factorOf = (clock: ThreadClock): number => (clock instanceof ScaledClock ? clock.factor : 1);

export function threadClock(factor: number): ThreadClock {
  const real = new RealClock();
  return factor === 1 ? real : new ScaledClock(real, factor);
}
