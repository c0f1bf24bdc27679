import type { RigMotion } from '@/shared/rig/document';
import { turnStepsOf } from '@/shared/rig/travel';
import type { Clock } from '../../interfaces/clock';
import { degOfSteps, stepsOfDeg } from '../rig-units';
import type { SimulatedController } from '../simulated-controller';
import { SimulatedLine } from '../simulated-line';
import { type BoardHost, LocalBoardHost } from './board-host';
import { BoardSession, type SessionOptions } from './board-session';
import { commission } from './commission';
import type { BoardListeners } from './emulated-board';
import { referenceFirmware } from './firmware-file';

export interface EmulatedControllerOptions {
  clock: Clock;
  rig: RigMotion;
  /** Of the noise on the line and of the memory after power-on; default 1. */
  seed?: number;
  /** Where the turntable stands at first, deg; default `rig.homeDeg`. */
  startDeg?: number;
  /** Whether the position is known at first, and the first warning over; default true. */
  homed?: boolean;
  /** Rate error of the board's crystal, parts per million; default 18. */
  ratePpm?: number;
}

const DESCRIPTION = 'the emulated controller board';
/** What a host knows of the line: 10 bits a byte at the agreed rate. */
const BYTE_MS = 10_000 / 115_200;
/** Homing begins so far below the edge: far enough to be a search, near enough to be short. */
const NEAR_EDGE_STEPS = -40;

/** The reference firmware on the emulated board, in this thread on the injected clock: the same handles as the light simulated controller. */
export function createEmulatedController(options: EmulatedControllerOptions): SimulatedController {
  const { clock, rig, seed = 1, homed = true, ratePpm } = options;
  const startSteps = stepsOfDeg(rig, options.startDeg ?? rig.homeDeg);
  const session = commissionedSession({ rig, homed, startSteps }, { seed, ...(ratePpm === undefined ? {} : { ratePpm }) });
  return controllerOn(new LocalBoardHost(clock, session), { clock, rig, seed });
}

/** A board with the reference firmware that knows its rig's limits, and its position where it is homed. */
export function commissionedSession(
  { rig, homed, startSteps }: { rig: RigMotion; homed: boolean; startSteps: number },
  options: Omit<SessionOptions, 'program' | 'startSteps'> = {},
  listeners: Pick<BoardListeners, 'onEdge'> = {},
): BoardSession {
  const start = homed ? NEAR_EDGE_STEPS : startSteps;
  const turnSteps = turnStepsOf(rig);
  const turns = turnSteps === null ? {} : { turnSteps };
  const session = new BoardSession({ ...options, ...turns, program: referenceFirmware(), startSteps: start }, listeners);
  commission(session, rig, { homedAt: homed ? startSteps : null });
  return session;
}

/** The handles of a simulated controller, over a board that runs anywhere. */
export function controllerOn(
  host: BoardHost,
  { clock, rig, seed = 1 }: Pick<EmulatedControllerOptions, 'clock' | 'rig' | 'seed'>,
): SimulatedController {
  const line = new SimulatedLine({
    clock,
    seed,
    byteMs: BYTE_MS,
    spendsByteTimes: false,
    description: DESCRIPTION,
    toController: (text) => host.write(`${text}\n`),
  });
  host.onLine = ({ text, atMs }) => line.fromController(`${text}\n`, atMs);
  const input = (name: 'interlock' | 'supply' | 'key', on: boolean) => host.do({ kind: 'input', input: name, on });
  return {
    factory: line.factory,
    trueAngleDegAt: (utcMs) => degOfSteps(rig, host.placeAt(clock.monotonicMs() + (utcMs - clock.utcMs()))),
    openInterlock: () => input('interlock', false),
    closeInterlock: () => input('interlock', true),
    loseSupply: () => input('supply', false),
    returnSupply: () => input('supply', true),
    turnArmKey: (on) => input('key', on),
    reset: (cause = 'power') => host.do({ kind: 'reset', cause }),
    dropLine: (ms) => line.drop(ms),
    garbage: (ms) => line.garble(ms),
    freeze: (ms) => line.freeze(ms),
    unplug: () => line.setMissing(true),
    plug: () => line.setMissing(false),
    slip: (steps) => host.do({ kind: 'slip', steps }),
  };
}
