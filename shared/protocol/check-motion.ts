import type { RigDocument, RigMotion } from '../rig/document';
import type { DwellStep, KickStep, ProtocolDocument, RotateStep, Step, SwingStep, SwingTarget } from './document';
import { swingMove, UnplayableStep } from './durations';
import type { Finding } from './finding';
import { homingObstacle, isWound, woundFinding } from './homing';
import { degrees, pathObstacles } from './motion-path';
import { greatestPosition, rotationRefusals } from './rotation';
import { MOST_SHUFFLED, shuffledChildren } from './shuffle';
import { resolveTarget, sideAt } from './stations';
import { partsDurationS, partsOf, type StepPart } from './step-parts';

/** Where a protocol begins, as far as that is known. */
export interface CheckStart {
  /** Turntable angle, deg; null where the controller does not know it, so that only homing may move the sources. */
  angleDeg: number | null;
  /** When it begins, UTC ms, and the IANA zone of the lab (default UTC): what depends on the time of day is then checked too. */
  utcMs?: number;
  timeZone?: string;
}

/** What may be known of the rig before a step. Where a repeat may run no pass at all, several states are possible. */
interface Situation {
  /** Turntable angle, deg; null while it is not known. */
  angleDeg: number | null;
  /** Length of the swing that has just ended, s; null when anything else came last. */
  swingS: number | null;
}

interface Walk {
  rig: RigDocument;
  findings: Finding[];
  /** The controller does not know the position: nothing but homing may move the sources. */
  isLost: boolean;
}

/**
 * Findings about where the sources go and about lengths that depend on it: unknown stations, moves before homing, the path rule,
 * speeds, beats. Without a start the sources may stand anywhere: a first move is then judged by where it ends, and by its path when the
 * run starts. Repeats must not nest deeper than 4.
 */
export function motionFindings(document: ProtocolDocument, rig: RigDocument, start: CheckStart | undefined): Finding[] {
  const walk: Walk = { rig, findings: [], isLost: start?.angleDeg === null };
  if (rig.motion === undefined) {
    walk.findings.push({
      code: 'motion-missing',
      path: null,
      message: 'The rig document has no motion section, so the protocol can be neither planned nor run on it. Add motion to the rig.',
    });
  }
  if (rig.motion !== undefined) walk.findings.push(...rangeFindings(rig.motion));
  if (rig.motion !== undefined && start?.angleDeg != null && isWound(rig.motion, start.angleDeg))
    return [...walk.findings, woundFinding(rig.motion, start.angleDeg)];
  const last = afterList(document.steps, [{ angleDeg: start?.angleDeg ?? null, swingS: null }], { walk, prefix: '' });
  const station = document.atEnd?.station;
  if (station !== undefined) {
    for (const situation of last) checkSwing({ kind: 'swing', to: station }, situation, { walk, path: 'atEnd' });
  }
  return walk.findings;
}

/** What the turntable link can write: microsteps per s or s² (its specification, Grammar). */
const greatestRate = 99_999;

function rangeFindings({ stepsPerDegree, minDeg, maxDeg, homeDeg, maxSpeed_deg_s, maxAcceleration_deg_s2 }: RigMotion): Finding[] {
  const rows: [string, number, number][] = [
    ['motion.maxSpeed_deg_s', maxSpeed_deg_s * stepsPerDegree, greatestRate],
    ['motion.maxAcceleration_deg_s2', maxAcceleration_deg_s2 * stepsPerDegree, greatestRate],
    ['motion.minDeg to motion.maxDeg', Math.max(Math.abs(minDeg - homeDeg), Math.abs(maxDeg - homeDeg)) * stepsPerDegree, greatestPosition],
  ];
  return rows
    .filter(([, steps, greatest]) => steps > greatest)
    .map(([name, steps, greatest]) => ({
      code: 'motion-out-of-range',
      path: null,
      message: `${name} of the rig comes to ${steps.toPrecision(3)} microsteps (per s or s²), more than the link to a controller can carry. Accepted is up to ${greatest}: lower it, or motion.stepsPerDegree.`,
    }));
}

function afterList(steps: readonly Step[], situations: Situation[], { walk, prefix }: { walk: Walk; prefix: string }): Situation[] {
  let current = situations;
  for (const [index, step] of steps.entries()) {
    const path = `${prefix}${index + 1}.${step.kind}`;
    current = different(afterStepAt(step, current, { walk, path }));
  }
  return current;
}

const afterStepAt = (step: Step, situations: Situation[], at: At): Situation[] =>
  step.kind === 'repeat' ? afterRepeat(step, situations, at) : situations.map((before) => afterStep(step, before, at));

/** Two passes show everything: angles are absolute, so the third pass begins as the second did. */
function afterRepeat(
  step: Extract<Step, { kind: 'repeat' }>,
  before: Situation[],
  { walk, path }: { walk: Walk; path: string },
): Situation[] {
  // One of more children is refused for their number.
  if (step.order === 'shuffled' && shuffledChildren(step) <= MOST_SHUFFLED) return afterShuffled(step, before, { walk, path });
  const inside = { walk, prefix: `${path}.` };
  const once = afterList(step.steps, before, inside);
  if (step.times === 1) return once;
  const twice = afterList(step.steps, once, inside);
  return step.times === undefined ? [...before, ...once, ...twice] : [...once, ...twice];
}

/** Any child may come first, and after any other: each is looked at from all that the others leave, until nothing new comes of it. */
function afterShuffled(
  step: Extract<Step, { kind: 'repeat' }>,
  before: Situation[],
  { walk, path }: { walk: Walk; path: string },
): Situation[] {
  let left: Situation[][] = step.steps.map(() => []);
  for (;;) {
    const after = step.steps.map((child, index) => {
      // In a single pass no child follows itself.
      const others = left.filter((_, other) => step.times !== 1 || other !== index);
      const from = different([...before, ...others.flat()]);
      return different(afterStepAt(child, from, { walk, path: `${path}.${index + 1}.${child.kind}` }));
    });
    if (after.flat().length === left.flat().length)
      return different(step.times === undefined ? [...before, ...after.flat()] : after.flat());
    left = after;
  }
}

function different(situations: Situation[]): Situation[] {
  return [...new Map(situations.map((situation) => [`${situation.angleDeg} ${situation.swingS}`, situation])).values()];
}

interface At {
  walk: Walk;
  path: string;
}

function afterStep(step: Exclude<Step, { kind: 'repeat' }>, before: Situation, at: At): Situation {
  switch (step.kind) {
    case 'home':
      return checkHome(before, at);
    case 'swing':
      return checkSwing(step, before, at);
    case 'kick':
      checkKick(step, before, at);
      break;
    case 'rotate':
      checkRotation(step, before, at);
      break;
    case 'dwell':
      checkDwell(step, before, at);
      break;
  }
  return { angleDeg: before.angleDeg, swingS: null };
}

function refuse({ walk, path }: At, code: string, message: string): void {
  walk.findings.push({ code, path, message });
}

function checkHome(before: Situation, at: At): Situation {
  const motion = at.walk.rig.motion;
  if (motion === undefined) return { angleDeg: null, swingS: null };
  const isLost = at.walk.isLost && before.angleDeg === null;
  const unsafe = isLost ? homingObstacle(at.walk.rig, null) : null;
  if (unsafe !== null) refuse(at, 'home-refused', `The rig does not home by itself, because ${unsafe}. Turn it to the edge by hand.`);
  for (const { code, reason } of pathObstacles(motion, before.angleDeg ?? motion.homeDeg, motion.homeDeg)) {
    refuse(
      at,
      code,
      `Homing to motion.homeDeg ${degrees(motion.homeDeg)} cannot be done: ${reason}. Correct the rig's motion, or swing to a place from which the way home is free.`,
    );
  }
  return { angleDeg: motion.homeDeg, swingS: null };
}

function knownStation(to: SwingTarget, { walk, path }: At): boolean {
  if (resolveTarget(walk.rig, to) !== null) return true;
  const names = Object.keys(walk.rig.stations);
  const known =
    names.length === 0
      ? 'The rig has none; name an angle as {"angle_deg": …}'
      : `Known stations: ${names.join(', ')}; or name an angle as {"angle_deg": …}`;
  walk.findings.push({ code: 'unknown-station', path, message: `The rig has no station "${String(to)}". ${known}.` });
  return false;
}

const homeFirst = 'The sources would move before their position is known. Put a home step before the first motion.';

/** It turns back by itself, so it ends where it began. */
function checkRotation(step: RotateStep, { angleDeg }: Situation, at: At): void {
  const { rig, isLost } = at.walk;
  if (rig.motion === undefined) return;
  if (angleDeg === null && isLost) refuse(at, 'home-first', homeFirst);
  for (const { code, message } of rotationRefusals(step, rig.motion, angleDeg)) refuse(at, code, message);
}

function checkKick(step: KickStep, { angleDeg }: Situation, at: At): void {
  const { rig, isLost } = at.walk;
  if (step.to !== undefined && !knownStation(step.to, at)) return;
  if (rig.motion === undefined) return;
  if (angleDeg === null) {
    if (isLost) refuse(at, 'home-first', homeFirst);
    return;
  }
  const target = resolveTarget(rig, step.to ?? (sideAt(rig, angleDeg) === 'near' ? 'far' : 'near'));
  const obstacles = target === null ? [] : pathObstacles(rig.motion, angleDeg, target.targetDeg);
  for (const { code, reason } of obstacles)
    refuse(
      at,
      code,
      `The kick from ${degrees(angleDeg)} towards ${degrees(target?.targetDeg ?? 0)} is not allowed: ${reason}. ${allowance(rig.motion)}`,
    );
  if (obstacles.length === 0) checkedParts(step, angleDeg, at);
}

/** The parts of a shaped swing or a kick; null where there are none, with the refusal where there should be. */
function checkedParts(step: KickStep | SwingStep, angleDeg: number, at: At): StepPart[] | null {
  try {
    return partsOf(step, at.walk.rig, angleDeg);
  } catch (error) {
    if (!(error instanceof UnplayableStep)) throw error;
    refuse(at, error.code, error.message);
    return null;
  }
}

function checkSwing(step: SwingStep, before: Situation, at: At): Situation {
  const { rig } = at.walk;
  const unknown = !knownStation(step.to, at);
  // A swing that is refused still is one: the beat after it is not to blame.
  if (unknown || rig.motion === undefined) return { angleDeg: before.angleDeg, swingS: 0 };
  checkSpeed(step, rig.motion, at);
  const target = swingMove(step, rig, before.angleDeg ?? 0);
  if (before.angleDeg === null && at.walk.isLost) refuse(at, 'home-first', homeFirst);
  const fromDeg = before.angleDeg ?? target.targetDeg;
  for (const { code, reason } of pathObstacles(rig.motion, fromDeg, target.targetDeg)) {
    const move =
      fromDeg === target.targetDeg
        ? `Standing at ${degrees(fromDeg)}`
        : `The move from ${degrees(fromDeg)} to ${degrees(target.targetDeg)}`;
    refuse(at, code, `${move} is not allowed: ${reason}. ${allowance(rig.motion)}`);
  }
  const isFree = pathObstacles(rig.motion, fromDeg, target.targetDeg).length === 0;
  const parts = before.angleDeg === null || !isFree ? null : checkedParts(step, fromDeg, at);
  return { angleDeg: target.targetDeg, swingS: parts === null ? swingMove(step, rig, fromDeg).durationS : partsDurationS(parts) };
}

function allowance(motion: RigMotion): string {
  const limits = `Accepted are straight moves within ${degrees(motion.minDeg)} to ${degrees(motion.maxDeg)}`;
  return (motion.keepOut ?? []).length === 0 ? `${limits}.` : `${limits} that meet no keep-out arc, nor one turned by 180°.`;
}

function checkSpeed(step: SwingStep, motion: RigMotion, at: At): void {
  if (step.speed_deg_s !== undefined && step.speed_deg_s > motion.maxSpeed_deg_s) {
    refuse(
      at,
      'too-fast',
      `speed_deg_s ${step.speed_deg_s} is above the rig's greatest speed. Accepted are values up to ${motion.maxSpeed_deg_s} deg/s.`,
    );
  }
  if (step.acceleration_deg_s2 !== undefined && step.acceleration_deg_s2 > motion.maxAcceleration_deg_s2) {
    refuse(
      at,
      'too-fast',
      `acceleration_deg_s2 ${step.acceleration_deg_s2} is above the rig's greatest acceleration. Accepted are values up to ${motion.maxAcceleration_deg_s2} deg/s².`,
    );
  }
}

function checkDwell(step: DwellStep, before: Situation, at: At): void {
  const { rig } = at.walk;
  const periodS = rig.measured?.period_s?.value;
  if (step.for_s === undefined && periodS === undefined) {
    refuse(
      at,
      'period-missing',
      `A dwell with ${step.periods === undefined ? 'beat_periods' : 'periods'} needs measured.period_s in the rig document. Measure the period first, or give the length as for_s.`,
    );
  }
  if (step.beat_periods === undefined || rig.motion === undefined) return;
  if (before.swingS === null) {
    refuse(
      at,
      'beat-needs-swing',
      'A dwell with beat_periods must directly follow a swing, because the beat counts from its start. Put the swing right before it, or give periods or for_s.',
    );
  } else if (periodS !== undefined && before.swingS >= step.beat_periods * periodS) {
    const beatS = step.beat_periods * periodS;
    refuse(
      at,
      'beat-too-short',
      `The swing before this dwell takes ${before.swingS.toFixed(1)} s, which leaves nothing of the beat of ${beatS.toFixed(1)} s. Accepted are beat_periods above ${(before.swingS / periodS).toPrecision(3)}.`,
    );
  }
}
