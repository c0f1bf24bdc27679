import { formatDuration } from '../lib/format-duration';
import type { RigMotion } from '../rig/document';
import type { RotateStep } from './document';
import { degrees } from './motion-path';

/** What the turntable link can write: microsteps from home (its specification, Grammar). */
export const greatestPosition = 9_999_999;

/** Why a rotation is refused, with what would be accepted. */
export interface RotationRefusal {
  code: 'keep-out' | 'turns-limit' | 'too-fast' | 'motion-out-of-range';
  message: string;
}

/** Where a rotation turns back, deg, from the turntable angle at which it begins. */
export const rotationEndDeg = ({ turns }: Pick<RotateStep, 'turns'>, fromDeg: number): number => fromDeg + 360 * turns;

/** Speed of a rotation on its way out, deg/s. */
const rotationSpeedDegS = ({ period_s }: Pick<RotateStep, 'period_s'>): number => 360 / period_s;

/** `3 turns clockwise, each in 30 min`. */
export function turnsWords({ turns, period_s }: Pick<RotateStep, 'period_s' | 'turns'>): string {
  const count = Math.abs(turns);
  const way = turns > 0 ? 'counter-clockwise' : 'clockwise';
  return count === 1 ? `a turn ${way} in ${formatDuration(period_s)}` : `${count} turns ${way}, each in ${formatDuration(period_s)}`;
}

/** The link writes whole thousandths of a microstep per second, rounded down: over hours the rest of one is minutes. At least one. */
export function writtenSpeedDegS(step: Pick<RotateStep, 'period_s'>, { stepsPerDegree }: Pick<RigMotion, 'stepsPerDegree'>): number {
  const thousandths = Math.floor(1000 * rotationSpeedDegS(step) * stepsPerDegree * (1 + 1e-12));
  return Math.max(1, thousandths) / 1000 / stepsPerDegree;
}

/**
 * Everything for which a rotation is refused on a rig: it passes every angle, winds up the cables, and goes beyond `minDeg` and `maxDeg`, which do
 * not apply during it. From an unknown angle (null) it is taken to begin at home.
 */
export function rotationRefusals(
  step: Pick<RotateStep, 'period_s' | 'turns'>,
  motion: RigMotion,
  fromDeg: number | null,
): RotationRefusal[] {
  return [...arcRefusals(motion), ...turnsRefusals(step, motion), ...speedRefusals(step, motion), ...rangeRefusals(step, motion, fromDeg)];
}

function arcRefusals({ keepOut = [] }: RigMotion): RotationRefusal[] {
  return keepOut.map(([from, to]) => ({
    code: 'keep-out',
    message: `A rotation passes every angle, so it meets the keep-out arc ${degrees(from)} to ${degrees(to)}. Accepted is a rotation on a rig without keep-out arcs only; elsewhere use swings.`,
  }));
}

function turnsRefusals({ turns }: Pick<RotateStep, 'turns'>, { turnsLimit = 0 }: RigMotion): RotationRefusal[] {
  if (Math.abs(turns) <= turnsLimit) return [];
  const most = Math.floor(turnsLimit);
  const accepted =
    most === 0 ? 'None is accepted before motion.turnsLimit says how many turns the cables stand' : `Accepted are up to ${most} either way`;
  return [
    {
      code: 'turns-limit',
      message: `turns ${turns} winds the cables further than motion.turnsLimit ${turnsLimit} of the rig allows. ${accepted}.`,
    },
  ];
}

function speedRefusals(step: Pick<RotateStep, 'period_s'>, { maxSpeed_deg_s }: RigMotion): RotationRefusal[] {
  if (rotationSpeedDegS(step) <= maxSpeed_deg_s) return [];
  return [
    {
      code: 'too-fast',
      message: `A turn in period_s ${step.period_s} is ${rotationSpeedDegS(step).toPrecision(3)} deg/s, above the rig's greatest speed ${maxSpeed_deg_s} deg/s. Accepted are values of period_s from ${360 / maxSpeed_deg_s} s.`,
    },
  ];
}

function rangeRefusals(
  { turns }: Pick<RotateStep, 'turns'>,
  { homeDeg, stepsPerDegree }: RigMotion,
  fromDeg: number | null,
): RotationRefusal[] {
  const beginDeg = (fromDeg ?? homeDeg) - homeDeg;
  if (Math.abs(rotationEndDeg({ turns }, beginDeg)) * stepsPerDegree <= greatestPosition) return [];
  const most = Math.max(0, Math.floor((greatestPosition / stepsPerDegree - Math.sign(turns) * beginDeg) / 360));
  return [
    {
      code: 'motion-out-of-range',
      message: `turns ${turns} comes to more microsteps from home than the link to a controller can carry (${greatestPosition}). Accepted are up to ${most} from here.`,
    },
  ];
}
