import { CODATA_2022_G } from '../physics/constants';
import { kickMoves } from '../physics/kick';
import { oscillatorOf } from '../physics/oscillator';
import type { PendulumSetting } from '../physics/pendulum';
import { shapedSwing, type ShapedSwing } from '../physics/shaped-swing';
import { movesByCentroid, type Slew, type TimedMove } from '../physics/timed-moves';
import { geometryOf } from '../physics/torque';
import { trapezoid } from '../physics/trapezoid';
import type { RigDocument } from '../rig/document';
import type { KickStep, RotateStep, Step, SwingStep } from './document';
import { motionOf, swingMove, type SwingMove, UnplayableStep } from './durations';
import { degrees } from './motion-path';
import { rotationEndDeg, writtenSpeedDegS } from './rotation';
import { resolveTarget, sideAt, stationAt } from './stations';

/** What a shaped swing, a kick and a rotation are made of: moves at given times, the pauses between them, and the ring-down after a kick. */
export type StepPart =
  /** `name`: a, b, …; `offsetS`: from the start of the first move. */
  | ({ kind: 'move'; name: string; offsetS: number } & SwingMove)
  /** Until `offsetS` after the start of the first move. */
  | { kind: 'pause'; offsetS: number; lengthS: number }
  | { kind: 'ring-down'; lengthS: number };

/** Two moves want the period to this relative standard uncertainty. */
export const greatestPeriodU = 0.007;
const ringDownPeriods = 3;
/** Sources that stand so near to a station (deg) stand at it: a counted angle is off by up to half a microstep. */
const atStationDeg = 0.06;

/** Relative standard uncertainty of the measured period; null where it was not measured. */
export function relativePeriodU(rig: RigDocument): number | null {
  const period = rig.measured?.period_s;
  return period === undefined ? null : period.u / period.value;
}

/** How many moves a shaped swing has on the rig: two where the period is known well enough, else three. */
export const shapedMoveCount = (rig: RigDocument): 2 | 3 => ((relativePeriodU(rig) ?? Infinity) <= greatestPeriodU ? 2 : 3);

/** The pendulum of the rig as plans take it, with G of CODATA 2022. @throws UnplayableStep where it was not measured. */
export function settingOf(rig: RigDocument): PendulumSetting {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null)
    throw new UnplayableStep(
      'period-missing',
      'Shaped swings and kicks need measured.period_s and measured.decayTime_s in the rig document. Measure them first, or use a plain swing.',
    );
  return { geometry: geometryOf(loaded(rig)), oscillator, bigG: CODATA_2022_G.value };
}

/** An empty control moves as the night does that it belongs to: by the source masses of the rig, where it knows them. */
function loaded(rig: RigDocument): RigDocument {
  const { shape, mass, orbit, height } = rig.sources;
  if (shape !== 'none' || mass === undefined || orbit === undefined) return rig;
  return { ...rig, sources: { ...rig.sources, shape: height === undefined ? 'sphere' : 'cylinder' } };
}

/** Nothing hangs on the angles where there are no masses: the same pauses, half way for a shaped swing. */
function emptyMoves(rig: RigDocument, slew: Slew, anglesDeg: readonly number[]): TimedMove[] {
  const setting = settingOf(rig);
  return movesByCentroid(setting, slew, { anglesDeg, pausesS: anglesDeg.slice(2).map(() => setting.oscillator.periodS / 2) });
}

const hasNoMass = (rig: RigDocument): boolean => loaded(rig).sources.shape === 'none';

export function slewOf(rig: RigDocument, step: Pick<SwingStep, 'speed_deg_s' | 'acceleration_deg_s2'>): Slew {
  const motion = motionOf(rig);
  return {
    speedDegS: step.speed_deg_s ?? motion.maxSpeed_deg_s,
    accelerationDegS2: step.acceleration_deg_s2 ?? motion.maxAcceleration_deg_s2,
  };
}

/** The angle of the station at which sources stand that are counted at `angleDeg`, or that angle itself. */
function standsAtDeg(rig: RigDocument, angleDeg: number): number {
  const station = Object.values(rig.stations).find(({ value }) => Math.abs(value - angleDeg) <= atStationDeg);
  return station?.value ?? angleDeg;
}

const isShaped = (step: Step): step is SwingStep => step.kind === 'swing' && step.profile === 'shaped';

/**
 * The parts of a shaped swing, a kick or a rotation from a turntable angle (deg), worked out once for a rig; null for a step that is not made
 * of parts, and for a shaped swing to where the sources stand already.
 * @throws UnplayableStep where the rig or its geometry does not allow it
 */
export function partsOf(step: Step, rig: RigDocument, fromDeg: number): StepPart[] | null {
  if (step.kind !== 'kick' && step.kind !== 'rotate' && !isShaped(step)) return null;
  const startDeg = standsAtDeg(rig, fromDeg);
  const key = JSON.stringify([step, startDeg]);
  let kept = known.get(rig);
  if (kept === undefined) known.set(rig, (kept = new Map()));
  let parts = kept.get(key);
  if (parts === undefined) kept.set(key, (parts = madeParts(step, rig, startDeg)));
  if (parts instanceof UnplayableStep) throw parts;
  return parts;
}

/** As `partsOf`; null too where the step cannot be carried out. */
export function partsIfPossible(step: Step, rig: RigDocument, fromDeg: number): StepPart[] | null {
  try {
    return partsOf(step, rig, fromDeg);
  } catch (error) {
    if (error instanceof UnplayableStep) return null;
    throw error;
  }
}

const known = new WeakMap<RigDocument, Map<string, StepPart[] | UnplayableStep | null>>();

function madeParts(step: KickStep | RotateStep | SwingStep, rig: RigDocument, fromDeg: number): StepPart[] | UnplayableStep | null {
  try {
    if (step.kind === 'rotate') return rotateParts(step, rig, fromDeg);
    return step.kind === 'kick' ? kickParts(step, rig, fromDeg) : shapedParts(step, rig, fromDeg);
  } catch (error) {
    if (error instanceof UnplayableStep) return error;
    throw error;
  }
}

/** The shaped swing of a step from an angle (deg). @throws UnplayableStep */
export function shapedOf(step: SwingStep, rig: RigDocument, fromDeg: number): ShapedSwing {
  const { targetDeg } = swingMove(step, rig, fromDeg);
  const found = shapedSwing({ setting: settingOf(rig), slew: slewOf(rig, step), fromDeg, toDeg: targetDeg, moves: shapedMoveCount(rig) });
  if ('why' in found)
    throw new UnplayableStep(
      'shaped-impossible',
      `A shaped swing from ${degrees(fromDeg)} to ${degrees(targetDeg)} cannot be made: ${found.why}. Use a plain swing, and a beat of whole periods.`,
    );
  return found;
}

function shapedParts(step: SwingStep, rig: RigDocument, fromDeg: number): StepPart[] | null {
  const target = swingMove(step, rig, fromDeg);
  if (Math.abs(target.targetDeg - fromDeg) <= atStationDeg) return null;
  const slew = slewOf(rig, step);
  const moves = hasNoMass(rig)
    ? emptyMoves(rig, slew, [fromDeg, (fromDeg + target.targetDeg) / 2, target.targetDeg])
    : shapedOf(step, rig, fromDeg).moves;
  return timed(moves, { slew, rig }).map((part) =>
    part.kind === 'move' && part.targetDeg === target.targetDeg ? { ...part, station: target.station } : part,
  );
}

function kickParts(step: KickStep, rig: RigDocument, fromDeg: number): StepPart[] {
  const setting = settingOf(rig);
  const to = step.to ?? (sideAt(rig, fromDeg) === 'near' ? 'far' : 'near');
  const target = resolveTarget(rig, to);
  if (target === null) throw new UnplayableStep('unknown-station', `The rig has no station "${String(to)}".`);
  const slew = slewOf(rig, {});
  const found = hasNoMass(rig)
    ? { moves: emptyMoves(rig, slew, [fromDeg, target.targetDeg, fromDeg]) }
    : kickMoves({ setting, slew, fromDeg, toDeg: target.targetDeg, amplitudeRad: step.amplitude_urad * 1e-6 });
  if ('why' in found) {
    const urad = found.limitRad === null ? null : Math.floor(found.limitRad * 1e6);
    throw new UnplayableStep(
      urad === null ? 'kick-impossible' : 'kick-too-large',
      urad === null
        ? `A kick from ${degrees(fromDeg)} to ${degrees(target.targetDeg)} cannot be made: ${found.why}.`
        : `A kick of ${step.amplitude_urad} µrad between ${degrees(fromDeg)} and ${degrees(target.targetDeg)} cannot be made: ${found.why}. Accepted is an amplitude below ${urad} µrad.`,
    );
  }
  return [
    ...timed(found.moves, { slew, rig }),
    { kind: 'ring-down', lengthS: (step.periods ?? ringDownPeriods) * setting.oscillator.periodS },
  ];
}

/** Out at the rate that is asked for, and back at once as fast as the rig turns: only the way out is evaluated. */
function rotateParts(step: RotateStep, rig: RigDocument, fromDeg: number): StepPart[] {
  const motion = motionOf(rig);
  const toDeg = rotationEndDeg(step, fromDeg);
  const out = turnPart(rig, { fromDeg, toDeg, ...slewOf(rig, { speed_deg_s: writtenSpeedDegS(step, motion) }) });
  const back = turnPart(rig, { fromDeg: toDeg, toDeg: fromDeg, ...slewOf(rig, {}) });
  return [
    { kind: 'move', name: 'a', offsetS: 0, ...out },
    { kind: 'move', name: 'b', offsetS: Math.round(1000 * out.durationS) / 1000, ...back },
  ];
}

function turnPart(rig: RigDocument, { fromDeg, toDeg, ...slew }: Slew & { fromDeg: number; toDeg: number }): SwingMove {
  return { targetDeg: toDeg, station: stationAt(rig, toDeg), ...slew, durationS: trapezoid({ fromDeg, toDeg, ...slew }).durationS };
}

/** Where a rotation of which this is a part began and ends, deg; null for any other part. */
export function rotationHomeDeg({ step, part }: { step: Step; part?: StepPart }): number | null {
  if (step.kind !== 'rotate' || part?.kind !== 'move') return null;
  return part.name === 'a' ? rotationEndDeg({ turns: -step.turns }, part.targetDeg) : part.targetDeg;
}

function timed(moves: readonly TimedMove[], { slew, rig }: { slew: Slew; rig: RigDocument }): StepPart[] {
  return moves.flatMap((move, index): StepPart[] => {
    const before = moves[index - 1];
    const { toDeg: targetDeg, durationS } = move;
    const offsetS = Math.round(move.startS * 1000) / 1000;
    const part: StepPart = {
      kind: 'move',
      name: nameOf(index),
      offsetS,
      targetDeg,
      station: stationAt(rig, targetDeg),
      ...slew,
      durationS,
    };
    return before === undefined ? [part] : [{ kind: 'pause', offsetS, lengthS: offsetS - before.startS - before.durationS }, part];
  });
}

/** a to z, then aa, ab, … */
const nameOf = (index: number): string =>
  (index < 26 ? '' : String.fromCharCode(96 + Math.floor(index / 26))) + String.fromCharCode(97 + (index % 26));

/** From the start of the first move to the end of the last part, s. */
export function partsDurationS(parts: readonly StepPart[]): number {
  return parts.reduce((endS, part) => {
    if (part.kind === 'move') return part.offsetS + part.durationS;
    return part.kind === 'pause' ? part.offsetS : endS + part.lengthS;
  }, 0);
}

/**
 * The move of a swing, or of a part, from the angle `fromDeg` (deg): a part that is finished after a hold takes as long as what is left of it.
 * @throws UnplayableStep as `swingMove`
 */
export function moveOf(item: { step: Step; part?: StepPart }, rig: RigDocument, fromDeg: number): SwingMove {
  const { step, part } = item;
  if (part?.kind === 'move') {
    const { targetDeg, station, speedDegS, accelerationDegS2 } = part;
    const { durationS } = trapezoid({ fromDeg, toDeg: targetDeg, speedDegS, accelerationDegS2 });
    return { targetDeg, station, speedDegS, accelerationDegS2, durationS };
  }
  return swingMove(step as SwingStep, rig, fromDeg);
}
