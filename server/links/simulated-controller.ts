import { PROTOCOL_VERSION, UNTAUGHT_LIMITS, type BootCause } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import { turnStepsOf } from '@/shared/rig/travel';
import type { ByteLineFactory } from '../interfaces/byte-line';
import type { Cancel, Clock } from '../interfaces/clock';
import type { MachineSetting } from './machine-setting';
import { degOfSteps, limitsOf, stepsOfDeg } from './rig-units';
import { SimulatedLine } from './simulated-line';
import { SimulatedMachine } from './simulated-machine';

export interface SimulatedControllerOptions {
  clock: Clock;
  rig: RigMotion;
  /** Of the noise on the line and the boot identifiers; default 1. */
  seed?: number;
  /** Where the turntable stands at first, deg; default `rig.homeDeg`. */
  startDeg?: number;
  /** Whether the position is known at first; default true. */
  homed?: boolean;
  /** Play of the drive between the directions, deg; default 0. */
  backlashDeg?: number;
  /** Whether the 10 s warning before the first motion has been given already; default true. */
  warned?: boolean;
  /** Rate error of the controller's crystal, parts per million; default 18. */
  ratePpm?: number;
  /** How long the controller has been on at first, s; default 4321.5. */
  uptimeS?: number;
  /** Line rate, bit/s; default 115200. */
  baudRate?: number;
  /** Whether it was taught the rig's limits before; default true. Otherwise it has those of SPEC 8.11. */
  taught?: boolean;
  /** Sees every line that arrives at the controller, and every line that it sends, whether or not anybody hears it. */
  tap?: { arrived(line: string): void; sent(line: string): void };
  version?: { major: number; minor: number };
}

export interface SimulatedController {
  factory: ByteLineFactory;
  /** Where the turntable truly stands (also between counted microsteps), deg. Past instants and the present only. */
  trueAngleDegAt(utcMs: number): number;
  openInterlock(): void;
  closeInterlock(): void;
  loseSupply(): void;
  returnSupply(): void;
  turnArmKey(on: boolean): void;
  /** Restarts the controller: 1 s deaf, position lost. */
  reset(cause?: BootCause): void;
  /** The line is dead for so long. */
  dropLine(ms: number): void;
  /** Noise on the line for so long. */
  garbage(ms: number): void;
  /** Bytes are kept back for so long, then come all at once. */
  freeze(ms: number): void;
  /** The port disappears, or comes back. */
  unplug(): void;
  plug(): void;
  /** The belt slips: the table moves by so many microsteps (positive ccw), and the count does not. */
  slip(steps: number): void;
}

export interface LightController extends SimulatedController {
  /** Where the table comes to rest (deg) if nobody speaks to the controller any more, and whether it knows that place. */
  ifLeft(): { angleDeg: number; positionKnown: boolean };
}

const DEFAULT_RATE_PPM = 18;
const DEFAULT_UPTIME_S = 4321.5;
const US_PER_MS = 1000;
const BITS_PER_BYTE = 10;

function settingOf({ rig, seed = 1, ...options }: SimulatedControllerOptions): MachineSetting {
  return {
    limits: options.taught === false ? UNTAUGHT_LIMITS : limitsOf(rig),
    startSteps: stepsOfDeg(rig, options.startDeg ?? rig.homeDeg),
    homed: options.homed ?? true,
    backlashSteps: Math.round((options.backlashDeg ?? 0) * rig.stepsPerDegree),
    turnSteps: turnStepsOf(rig),
    warned: options.warned ?? true,
    bootCount: (seed >>> 0) * 256 + 1,
    uptimeUs: (options.uptimeS ?? DEFAULT_UPTIME_S) * US_PER_MS * US_PER_MS,
    version: options.version ?? PROTOCOL_VERSION,
    firmware: 'simulated',
  };
}

function placeIfLeft(machine: SimulatedMachine, rig: RigMotion, us: number): { angleDeg: number; positionKnown: boolean } {
  const { steps, known } = machine.ifLeft(us);
  return { angleDeg: degOfSteps(rig, steps), positionKnown: known };
}

/**
 * The light simulated controller: the machine of SPEC.md on an injected clock, behind the same bytes as a real one.
 * Its own clock has an offset (it has been on for a while) and a rate error, as a crystal has.
 */
export function createSimulatedController(options: SimulatedControllerOptions): LightController {
  const { clock, rig, seed = 1 } = options;
  const bornMs = clock.monotonicMs();
  const usPerMs = US_PER_MS * (1 + (options.ratePpm ?? DEFAULT_RATE_PPM) * 1e-6);
  const usAt = (monotonicMs: number) => (monotonicMs - bornMs) * usPerMs;
  const msAt = (us: number) => bornMs + us / usPerMs;
  const setting = settingOf(options);
  const line = new SimulatedLine({
    clock,
    seed,
    byteMs: (BITS_PER_BYTE * 1000) / (options.baudRate ?? 115_200),
    spendsByteTimes: true,
    description: 'the simulated turntable',
    toController: (text) => {
      options.tap?.arrived(text);
      act((us) => machine.receive(text, us));
    },
  });
  const machine = new SimulatedMachine(setting, (text, atUs) => {
    options.tap?.sent(text);
    line.fromController(text, msAt(atUs));
  });
  let waking: { atUs: number; cancel: Cancel } | null = null;

  /** After anything was done to the machine: be there when its next thing falls due. */
  function wakeInTime(): void {
    const dueUs = machine.nextDueUs();
    if (waking?.atUs === dueUs) return;
    waking?.cancel();
    waking = null;
    if (dueUs === Infinity) return;
    const cancel = clock.after(msAt(dueUs) - clock.monotonicMs(), () => {
      waking = null;
      act((us) => machine.runTo(Math.max(us, dueUs)));
    });
    waking = { atUs: dueUs, cancel };
  }

  function act(deed: (us: number) => void): void {
    deed(usAt(clock.monotonicMs()));
    wakeInTime();
  }

  return {
    factory: line.factory,
    trueAngleDegAt: (utcMs) => degOfSteps(rig, machine.motion.tableAt(usAt(clock.monotonicMs() + (utcMs - clock.utcMs())))),
    ifLeft: () => placeIfLeft(machine, rig, usAt(clock.monotonicMs())),
    openInterlock: () => act((us) => machine.setInput('interlock', false, us)),
    closeInterlock: () => act((us) => machine.setInput('interlock', true, us)),
    loseSupply: () => act((us) => machine.setInput('supply', false, us)),
    returnSupply: () => act((us) => machine.setInput('supply', true, us)),
    turnArmKey: (on) => act((us) => machine.setInput('key', on, us)),
    reset: (cause = 'power') => act((us) => machine.reset(us, cause)),
    dropLine: (ms) => line.drop(ms),
    garbage: (ms) => line.garble(ms),
    freeze: (ms) => line.freeze(ms),
    unplug: () => line.setMissing(true),
    plug: () => line.setMissing(false),
    slip: (steps) => act((us) => (machine.runTo(us), machine.motion.slip(steps, us))),
  };
}
