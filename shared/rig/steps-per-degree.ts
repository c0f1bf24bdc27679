/** Microsteps per degree of the turntable out of turns that a person watched or that the home flag proved. Pure. */

export interface TurnReading {
  /** Microsteps ordered and carried out, with their sign: positive is counter-clockwise seen from above. */
  steps: number;
  /** Angle turned, deg, with the same sense of sign. */
  turnedDeg: number;
  /** Standard uncertainty of the angle turned (k = 1), deg. */
  uDeg: number;
}

export interface StepsPerDegree {
  value: number;
  /** Standard uncertainty (k = 1). */
  u: number;
  /** By what the scatter of several turns widened u; 1 where they agree within their uncertainties. */
  widenedBy: number;
}

/** Fewer microsteps than this cannot be told from the play of the drive (common practice, no source). */
export const fewestSteps = 10;

/** What is wrong with a reading and what would be right; null when it can be used. */
export function turnProblem({ steps, turnedDeg, uDeg }: TurnReading): { field: 'steps' | 'turnedDeg' | 'uDeg'; message: string } | null {
  if (!Number.isInteger(steps) || Math.abs(steps) < fewestSteps)
    return { field: 'steps', message: `The turn is ${String(steps)} microsteps; at least ${fewestSteps} are needed to measure one.` };
  if (!Number.isFinite(turnedDeg) || turnedDeg === 0)
    return { field: 'turnedDeg', message: 'Enter the angle that the table turned, in degrees; it is not 0.' };
  if (!Number.isFinite(uDeg) || uDeg <= 0)
    return { field: 'uDeg', message: 'Enter the standard uncertainty of the angle, in degrees; it is more than 0.' };
  if (uDeg >= Math.abs(turnedDeg))
    return { field: 'uDeg', message: 'The uncertainty is as large as the angle: turn further, or read the angle better.' };
  if (Math.sign(steps) !== Math.sign(turnedDeg))
    return {
      field: 'turnedDeg',
      message: 'The angle has the other sign than the steps: the table would turn the wrong way. See to the direction first.',
    };
  return null;
}

/**
 * Weighted least squares of turned = steps · c through zero, with c = 1 / (steps per degree): the steps are counted and exact, the angles
 * carry the uncertainty. Scatter beyond it widens u (Birge ratio).
 * @throws RangeError without a reading, or for one that {@link turnProblem} refuses
 */
export function stepsPerDegreeOf(readings: readonly TurnReading[]): StepsPerDegree {
  const [first] = readings;
  if (first === undefined) throw new RangeError('at least one reading is needed');
  for (const reading of readings) {
    const problem = turnProblem(reading);
    if (problem !== null) throw new RangeError(problem.message);
  }
  const sum = (of: (reading: TurnReading) => number) => readings.reduce((total, reading) => total + of(reading) / reading.uDeg ** 2, 0);
  const weight = sum(({ steps }) => steps * steps);
  const degPerStep = sum(({ steps, turnedDeg }) => steps * turnedDeg) / weight;
  const misfit = sum(({ steps, turnedDeg }) => (turnedDeg - degPerStep * steps) ** 2);
  const widenedBy = readings.length < 2 ? 1 : Math.max(1, Math.sqrt(misfit / (readings.length - 1)));
  return { value: 1 / degPerStep, u: widenedBy / Math.sqrt(weight) / degPerStep ** 2, widenedBy };
}

/** A value as it is kept: to the second digit of its uncertainty. */
export function roundedTo({ value, u }: Pick<StepsPerDegree, 'value' | 'u'>): number {
  const decade = Number(u.toExponential(1).split('e')[1]);
  return Number(value.toFixed(Math.min(12, Math.max(0, 1 - decade))));
}

export interface StepsComparison {
  /** (measured − documented) / documented. */
  share: number;
  uShare: number;
  /** Whether the two agree within twice the uncertainty. */
  agree: boolean;
  /** By how much a move of 90° by the documented value would miss, deg. */
  missAt90Deg: number;
}

/** What was measured against what the rig document says. */
export function compareSteps({ value, u }: Pick<StepsPerDegree, 'value' | 'u'>, documented: number): StepsComparison {
  const share = (value - documented) / documented;
  const uShare = u / documented;
  // A move of 90° orders 90 · documented microsteps, which turn the table by 90 · documented / measured.
  return { share, uShare, agree: Math.abs(share) <= 2 * uShare, missAt90Deg: 90 * (documented / value - 1) };
}

export interface EdgePass {
  /** Count at the pass of the home flag's edge, microsteps. */
  steps: number;
  direction: 'ccw' | 'cw';
}

/**
 * Steps between the last two passes of a flag edge in one direction, signed; null while there are none. Passes in opposite directions are
 * not paired: between them lies the backlash.
 */
export function stepsBetweenEdges(passes: readonly EdgePass[]): number | null {
  const last = passes.at(-1);
  if (last === undefined) return null;
  const before = passes
    .slice(0, -1)
    .findLast(({ direction, steps }) => direction === last.direction && Math.abs(last.steps - steps) >= fewestSteps);
  return before === undefined ? null : last.steps - before.steps;
}
