import type { RigMotion } from '@/shared/rig/document';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import type { Clock } from '@/server/interfaces/clock';

/** A controller on its line, with everything that the conformance suite does to it. One suite, any number of benches. */
export interface LinkBench {
  clock: Clock;
  /** The epoch under which this bench's controller can be driven without raising the one it keeps; absent: any will do. */
  epoch?: number;
  factory: ByteLineFactory;
  /** Lets time pass until `met`; fails with `what` when it is not met within `withinMs`. */
  until(what: string, met: () => boolean, withinMs: number): Promise<void>;
  pass(ms: number): Promise<void>;
  /** Where the turntable truly stands, deg. */
  trueAngleDeg(): Promise<number>;
  reset(): Promise<void>;
  /** The line is dead for so long. */
  drop(ms: number): Promise<void>;
  garbage(ms: number): Promise<void>;
  interlock(level: 'open' | 'closed'): Promise<void>;
  armKey(level: 'on' | 'off'): Promise<void>;
  /** The port disappears, as a USB plug that is pulled; and comes back. */
  unplug(): Promise<void>;
  plug(): Promise<void>;
  dispose(): Promise<void>;
}

/** What some benches cannot do. */
export type BenchDeed = 'armKey' | 'interlock' | 'reset';

export interface BenchMaker {
  name: string;
  /** What the controller calls its firmware. */
  firmware: string;
  /** A controller whose position is known and whose warning is over. */
  make(): Promise<LinkBench>;
  /** The same line with something else at its end; null where the line is one with its controller. */
  makeStranger: ((kind: 'babble' | 'other-major') => Promise<LinkBench>) | null;
  /** What this bench cannot do, and why: the tests that need it are skipped with that reason in their name. */
  cannot?: Partial<Record<BenchDeed, string>>;
  /** How far the logged beginning of a timed move may lie from the one asked for, s. */
  beginToleranceS: number;
  /** Length of the noise in a motion: with the pauses of a busy machine shorter than the lease, ms. */
  noiseMs: number;
  dispose(): Promise<void>;
}

/** A quick turntable, so that real time is short: 100° take 4 s. */
export const benchRig: RigMotion = {
  stepsPerDegree: 100,
  minDeg: -170,
  maxDeg: 170,
  maxSpeed_deg_s: 30,
  maxAcceleration_deg_s2: 60,
  homeDeg: 0,
  homeSpeed_deg_s: 10,
};

/** A test that needs deeds of its bench: skipped, with the reason in its name, where the bench cannot do them. */
export function testWith({ cannot = {} }: BenchMaker, ...deeds: BenchDeed[]): (name: string, body: () => Promise<void>) => void {
  const missing = deeds.flatMap((deed) => cannot[deed] ?? []);
  // reason: stands in the name of the test
  return missing.length === 0 ? test : (name, body) => test.skip(`${name} (${[...new Set(missing)].join('; ')})`, body);
}
