import { catchMotion } from './catch-motion';
import type { PendulumSetting } from './pendulum';
import { angleOfRest, areApart, motionAfter, movesByCentroid, type Slew, standingAt, type TimedMove, torqueCentroidS } from './timed-moves';
import { trapezoid } from './trapezoid';

/**
 * Swings that leave the pendulum nearly at rest: the sources stand half a period on the way (two moves), or twice half a period (three).
 * Smith 1957 for two moves, Singer and Seering 1990 for three (from memory); here with the exact torque and the real slew.
 */

export interface ShapedSwingInput {
  setting: PendulumSetting;
  slew: Slew;
  fromDeg: number;
  toDeg: number;
  moves: 2 | 3;
}

export interface ShapedSwing {
  moves: TimedMove[];
  /** From the start of the first move to the end of the last, s. */
  durationS: number;
  /** What the exact equation leaves of the step in the rest as ringing: amplitude over step. */
  residual: number;
}

export interface UnshapedSwing {
  /** Why no shaped swing leads from the one angle to the other, as half a sentence. */
  why: string;
}

/** Less of a step in the rest than this is none, rad. */
const leastStepRad = 1e-9;
/** A shaped swing that leaves more of the step than this is none. */
const greatestResidual = 0.05;

/** Fractions of the step reached after each move but the last. */
function levels(count: 2 | 3, halfRatio: number): number[] {
  const sum = 1 + halfRatio;
  return count === 2 ? [1 / sum] : [1 / (sum * sum), (1 + 2 * halfRatio) / (sum * sum)];
}

/** The moves of a shaped swing, or why there are none. */
export function shapedSwing(input: ShapedSwingInput): ShapedSwing | UnshapedSwing {
  const { setting, fromDeg, toDeg } = input;
  let stepRad: number;
  try {
    stepRad = standingAt(setting, toDeg).restRad - standingAt(setting, fromDeg).restRad;
  } catch (error) {
    return { why: (error as Error).message };
  }
  if (Math.abs(stepRad) < leastStepRad)
    return { why: 'the pendulum rests at the same angle before and after, so there is nothing to shape' };
  const byRule = movesByRule(input);
  if (!areApart(byRule)) return { why: tooSlow(byRule) };
  const moves = polished(input, byRule, stepRad);
  const residual = Math.abs(motionAfter(setting, input.slew, moves).amplitudeRad / stepRad);
  if (!(residual <= greatestResidual))
    return {
      why: `the torque does not go evenly from the one to the other: ${(100 * residual).toFixed(0)} % of the step would be left as ringing`,
    };
  const last = moves[moves.length - 1] as TimedMove;
  return { moves, durationS: last.startS + last.durationS, residual };
}

const tooSlow = (moves: readonly TimedMove[]) =>
  `its moves of ${moves.map(({ durationS }) => durationS.toFixed(0)).join(' and ')} s do not fit into half periods; a faster turntable would`;

/**
 * The closed rule: the pendulum's own period and decay at each intermediate angle give the fraction of the step that is reached there and
 * how long the sources stand, counted from torque centroid to torque centroid.
 */
function movesByRule(input: ShapedSwingInput): TimedMove[] {
  const { setting, slew, fromDeg, toDeg } = input;
  const from = standingAt(setting, fromDeg);
  const stepRad = standingAt(setting, toDeg).restRad - from.restRad;
  const count = input.moves - 1;
  let between = Array.from({ length: count }, () => standingAt(setting, (fromDeg + toDeg) / 2));
  let anglesDeg: number[] = [];
  for (let round = 0; round < 4; round += 1) {
    const fractions = between.map((standing, index) => levels(input.moves, standing.halfRatio)[index] ?? 0);
    anglesDeg = fractions.map((fraction) => angleOfRest(setting, { fromDeg, toDeg }, from.restRad + fraction * stepRad));
    between = anglesDeg.map((angleDeg) => standingAt(setting, angleDeg));
  }
  const pausesS = between.map((standing) => pauseS(standing.omega, setting.oscillator.gamma));
  return movesByCentroid(setting, slew, { anglesDeg: [fromDeg, ...anglesDeg, toDeg], pausesS });
}

/** Half a damped period: what it takes to catch a pendulum that rests away from the target. */
const pauseS = (omega: number, gamma: number): number => catchMotion({ off: -1, speed: 0 }, { omega, gamma })?.holdS ?? Math.PI / omega;

/** Newton's rule on the last intermediate angle and on the start of the last move, until the exact equation leaves nothing; the rule's own moves where that fails. */
function polished(input: ShapedSwingInput, byRule: TimedMove[], stepRad: number): TimedMove[] {
  const { setting, slew } = input;
  const { omega } = standingAt(setting, input.toDeg);
  const left = (moves: TimedMove[]): [number, number] => {
    const { offRad, speedRadS } = motionAfter(setting, slew, moves);
    return [offRad / stepRad, speedRadS / (omega * stepRad)];
  };
  let best = byRule;
  let off = left(best);
  for (let round = 0; round < 4 && Math.hypot(...off) > 1e-7; round += 1) {
    const [stepDeg, stepS] = [0.01, 0.05];
    const byAngle = left(changed(input, best, { deg: stepDeg, s: 0 }));
    const byTime = left(changed(input, best, { deg: 0, s: stepS }));
    const [a, b] = [(byAngle[0] - off[0]) / stepDeg, (byTime[0] - off[0]) / stepS];
    const [c, d] = [(byAngle[1] - off[1]) / stepDeg, (byTime[1] - off[1]) / stepS];
    const det = a * d - b * c;
    const next = changed(input, best, { deg: (b * off[1] - d * off[0]) / det, s: (c * off[0] - a * off[1]) / det });
    if (!isWithin(input, next)) return best;
    const nextOff = left(next);
    if (!(Math.hypot(...nextOff) < Math.hypot(...off))) return best;
    [best, off] = [next, nextOff];
  }
  return best;
}

/** The intermediate angle of the last two moves changed by `deg`, the pause before the last by `s`; centroids keep their distance otherwise. */
function changed({ setting, slew }: ShapedSwingInput, moves: readonly TimedMove[], { deg, s }: { deg: number; s: number }): TimedMove[] {
  const [before, last] = moves.slice(-2) as [TimedMove, TimedMove];
  const betweenDeg = before.toDeg + deg;
  const centroidOf = (move: TimedMove) => move.startS + torqueCentroidS(setting, slew, move);
  const made = (move: TimedMove, ends: { fromDeg: number; toDeg: number }, centroidS: number): TimedMove => ({
    ...ends,
    startS: move.startS === 0 ? 0 : centroidS - torqueCentroidS(setting, slew, ends),
    durationS: trapezoid({ ...ends, ...slew }).durationS,
  });
  const first = made(before, { fromDeg: before.fromDeg, toDeg: betweenDeg }, centroidOf(before));
  const shiftS = centroidOf(first) - centroidOf(before);
  return [...moves.slice(0, -2), first, made(last, { fromDeg: betweenDeg, toDeg: last.toDeg }, centroidOf(last) + shiftS + s)];
}

/** The moves stay apart and on the way. */
function isWithin({ fromDeg, toDeg }: ShapedSwingInput, moves: readonly TimedMove[]): boolean {
  const [low, high] = [Math.min(fromDeg, toDeg), Math.max(fromDeg, toDeg)];
  return areApart(moves) && moves.every((move) => Number.isFinite(move.startS) && move.toDeg >= low && move.toDeg <= high);
}

/**
 * What is left of the step if the pendulum's period is really longer by the fraction `periodError` than the swing was made for: amplitude
 * over step, by the exact equation.
 */
export function residualAtPeriod(
  { setting, slew }: Pick<ShapedSwingInput, 'setting' | 'slew'>,
  moves: readonly TimedMove[],
  periodError: number,
): number {
  const { oscillator } = setting;
  const scale = 1 + periodError;
  const other: PendulumSetting = {
    ...setting,
    oscillator: {
      ...oscillator,
      periodS: oscillator.periodS * scale,
      kappa: oscillator.kappa / (scale * scale),
      gamma: oscillator.gamma / scale,
    },
  };
  const [first, last] = [moves[0] as TimedMove, moves[moves.length - 1] as TimedMove];
  const stepRad = standingAt(other, last.toDeg).restRad - standingAt(other, first.fromDeg).restRad;
  return Math.abs(motionAfter(other, slew, moves).amplitudeRad / stepRad);
}
