import type { RigDocument } from './document';

/**
 * Position without an encoder. The home flag reports the count at every pass of its edge, so each swing through the middle proves the
 * count: the change since homing is the slip of the table, the difference between the directions is the backlash. Pure: records in,
 * records out.
 */

export type EdgeDirection = 'ccw' | 'cw';

/** One pass of the edge as the controller reports it; `angleDeg` is what was counted there. */
export interface EdgePass {
  utcMs: number;
  /** Standard uncertainty of the instant, s. */
  uS: number;
  direction: EdgeDirection;
  angleDeg: number;
}

interface SeenPass {
  utcMs: number;
  uS: number;
  /** Count at the edge, microsteps from home: where nothing is wrong 0 in ccw, −1 − backlash in cw (SPEC 8.6). */
  offsetSteps: number;
}

/** A pass outside the tolerance. */
export interface Slip {
  /** Signed: the count at the edge less the count that belongs there, microsteps. */
  steps: number;
  direction: EdgeDirection;
  utcMs: number;
}

/** What the passes since homing say of the count. Plain data. */
export interface PositionProof {
  /** Last pass in each direction since homing; homing itself meets the edge in ccw, at 0. */
  ccw: SeenPass | null;
  cw: SeenPass | null;
  /** The first good cw pass since homing, microsteps: later ones are held against it. */
  cwReference: number | null;
  /** The last pass (or homing) that proved the count. */
  proved: { utcMs: number; uS: number; direction: EdgeDirection; slipSteps: number } | null;
  /** Motions that ended since then, or since the beginning where nothing was proved yet. */
  motionsSince: number;
  /** The count is wrong since some time before this pass; only homing makes it right. */
  slip: Slip | null;
}

export const nothingProved: PositionProof = { ccw: null, cw: null, cwReference: null, proved: null, motionsSince: 0, slip: null };

/** Homing has set the count to 0 at the edge, met in ccw: all that was known before belongs to another count. */
export const homedProof = ({ utcMs, uS }: { utcMs: number; uS: number }): PositionProof => ({
  ...nothingProved,
  ccw: { utcMs, uS, offsetSteps: 0 },
  proved: { utcMs, uS, direction: 'ccw', slipSteps: 0 },
});

/** Greatest standard deviation of a pass at which a home flag is accepted in commissioning, deg (common practice, no source). */
const FLAG_SD_DEG = 0.01;

export const stepDeg = (rig: RigDocument): number => 1 / (rig.motion?.stepsPerDegree ?? 1);

/**
 * Standard uncertainty of one reading of the edge, deg: the microstep (rectangular, its width; GUM 4.3.7, F.2.2.1) and the repeatability
 * of the flag.
 */
export const passU = (rig: RigDocument): number => Math.hypot(stepDeg(rig) / Math.sqrt(12), FLAG_SD_DEG);

/**
 * Greatest slip that still proves the count, deg. The rig document has no field for it, so: a microstep, and three standard deviations of
 * the difference of two passes of the flag. A pass of a sound table is outside in fewer than one of a thousand.
 */
export const slipToleranceDeg = (rig: RigDocument): number => stepDeg(rig) + 3 * Math.SQRT2 * FLAG_SD_DEG;

/** Backlash by the last passes in the two directions, microsteps; null until both were seen since homing. */
export function backlashSteps({ ccw, cw }: PositionProof): number | null {
  // The flag changes its level at 0 in ccw and at −1 in cw, without any backlash.
  return ccw === null || cw === null ? null : ccw.offsetSteps - cw.offsetSteps - 1;
}

/** By how much the count at a pass is off what belongs there, microsteps. */
function slipAt(rig: RigDocument, proof: PositionProof, pass: Pick<EdgePass, 'direction' | 'angleDeg'>): number {
  const offsetSteps = offsetOf(rig, pass.angleDeg);
  if (pass.direction === 'ccw') return offsetSteps;
  if (proof.cwReference !== null) return offsetSteps - proof.cwReference;
  // The first cw pass since homing: backlash up to that of the rig document cannot be told from slip, and is none.
  const past = offsetSteps + 1;
  const allowed = Math.round((rig.motion?.backlash_deg ?? 0) / stepDeg(rig));
  return (past > 0 ? past : Math.min(0, past + allowed)) + 0;
}

function offsetOf(rig: RigDocument, angleDeg: number): number {
  return Math.round((angleDeg - (rig.motion?.homeDeg ?? 0)) / stepDeg(rig)) + 0;
}

export const isWithin = (rig: RigDocument, steps: number): boolean => Math.abs(steps) * stepDeg(rig) <= slipToleranceDeg(rig);

/**
 * Holds a pass against what homing and the passes before it say. Within the tolerance it proves the count anew; outside it the count is
 * wrong, and stays so for every later pass until the rig is homed.
 */
export function afterPass(rig: RigDocument, proof: PositionProof, pass: EdgePass): PositionProof {
  const { utcMs, uS, direction } = pass;
  const offsetSteps = offsetOf(rig, pass.angleDeg);
  const slipSteps = slipAt(rig, proof, pass);
  const seen: PositionProof = { ...proof, [direction]: { utcMs, uS, offsetSteps } };
  if (proof.slip !== null) return seen;
  if (!isWithin(rig, slipSteps)) return { ...seen, slip: { steps: slipSteps, direction, utcMs } };
  const cwReference = direction === 'cw' ? (proof.cwReference ?? offsetSteps) : proof.cwReference;
  return { ...seen, cwReference, proved: { utcMs, uS, direction, slipSteps }, motionsSince: 0 };
}

/** A motion other than homing has ended. */
export const afterMotion = (proof: PositionProof): PositionProof => ({ ...proof, motionsSince: proof.motionsSince + 1 });

/**
 * Where an angle comes from (the words of the archive format): proved at the edge in the motion that led there, or right before it;
 * otherwise counted.
 */
export function angleSourceOf({ proved, motionsSince, slip }: PositionProof): 'counted' | 'edge-verified' {
  return proved !== null && motionsSince <= 1 && slip === null ? 'edge-verified' : 'counted';
}

/**
 * Standard uncertainty of an angle, deg: u² = u_p² + b²/12 + s² + m t²/3.
 * u_p: the reading of the edge from which is counted (`passU`). b: the backlash, measured or else that of the rig document (the greater),
 * rectangular over its width (GUM F.2.2.1). s: the slip of the last pass, known and not corrected for (GUM F.2.4.5). m: motions since the
 * proof beyond the first, one more where nothing was ever proved, each of which may have slipped unseen by up to the tolerance t to either
 * side (rectangular, GUM 4.3.7). Time alone adds nothing: the drivers hold the table. The error of the motor within a step is not known to
 * the rig document and not in it.
 */
export function angleU(rig: RigDocument, proof: PositionProof): number {
  const measuredDeg = Math.max(0, backlashSteps(proof) ?? 0) * stepDeg(rig);
  const backlashDeg = Math.max(measuredDeg, rig.motion?.backlash_deg ?? 0);
  const unprovedMotions = proof.proved === null ? proof.motionsSince + 1 : Math.max(0, proof.motionsSince - 1);
  const slipDeg = (proof.slip?.steps ?? proof.proved?.slipSteps ?? 0) * stepDeg(rig);
  return Math.hypot(passU(rig), backlashDeg / Math.sqrt(12), slipDeg, slipToleranceDeg(rig) * Math.sqrt(unprovedMotions / 3));
}

/**
 * Standard uncertainty of an angle that was logged before a slip was found, deg: the table may have stood off by anything from nothing to
 * the whole slip (rectangular; its root mean square about the logged angle is the slip over √3, GUM F.2.4.5).
 */
export const doubtfulU = (rig: RigDocument, loggedU: number | null, slipSteps: number): number =>
  Math.hypot(loggedU ?? angleU(rig, nothingProved), (slipSteps * stepDeg(rig)) / Math.sqrt(3));
