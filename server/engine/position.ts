import {
  afterMotion,
  afterPass,
  angleSourceOf,
  angleU,
  doubtfulU,
  type EdgeDirection,
  homedProof,
  isWithin,
  nothingProved,
  slipToleranceDeg,
  stepDeg,
} from '@/shared/rig/position-proof';
import type { StepRow } from '@/shared/archive/run-records';
import type { Draft } from './draft';
import type { KnownPosition } from './run-context';

/** How the run keeps book of what proves its counted angles, and what it does when the table has slipped. */

export const nothingKnown: KnownPosition = { proof: nothingProved, dwells: [], homingOffDeg: null };

/** What a row says of its angle, as things stand. */
export const angleFacts = ({ context, start }: Draft): Pick<StepRow, 'angleSource' | 'uAngleDeg'> => ({
  angleSource: angleSourceOf(context.position.proof),
  uAngleDeg: angleU(start.rig, context.position.proof),
});

/** The count is gone, and with it what proved it. */
export function forgetPosition({ context }: Draft): void {
  context.position = nothingKnown;
}

/** A row is closed: a motion may have slipped, a dwell waits for the next pass. */
export function noteRowClosed({ context, start }: Draft, row: StepRow, moved: boolean): void {
  const { position } = context;
  if (row.kind === 'dwell') position.dwells.push(structuredClone(row));
  if (!moved) return;
  if (row.kind !== 'home') position.proof = afterMotion(position.proof);
  Object.assign(row, { angleSource: angleSourceOf(position.proof), uAngleDeg: angleU(start.rig, position.proof) });
}

/** Each pass of the home edge proves the counted angle, or tells by how much it is off. While homing, only homing itself judges. */
export function noteEdge(draft: Draft): void {
  const { link } = draft.told('link.edge');
  const { angleDeg, direction, at } = link;
  const { rig } = draft.start;
  const { position, step } = draft.context;
  if (angleDeg === null) return draft.log('home-edge', { angleDeg, direction });
  const homeDeg = rig.motion?.homeDeg ?? 0;
  if (isHoming(draft)) {
    const offDeg = angleDeg - homeDeg;
    if (direction === 'ccw') position.homingOffDeg = offDeg;
    return draft.log('home-edge', { angleDeg, direction, offDeg });
  }
  const placeDeg = placeInTurn(draft, angleDeg - homeDeg);
  if (placeDeg === null) return draft.log('flag-end', { angleDeg, direction });
  const offDeg = placeDeg;
  const before = position.proof;
  position.proof = afterPass(rig, before, { utcMs: at.utcMs, uS: at.uS, direction, angleDeg: homeDeg + placeDeg });
  const { slip, proved } = position.proof;
  const slipSteps = slip?.steps ?? proved?.slipSteps ?? 0;
  draft.log('home-edge', { angleDeg, direction, offDeg, slipSteps, slipDeg: slipSteps * stepDeg(rig), proved: slip === null });
  if (slip === null) {
    position.dwells = [];
    if (step?.motion != null) saveFacts(draft, step.row);
  } else if (before.slip === null) noteSlip(draft, { ...slip, found: 'pass' });
}

/** Further from the edge than this is the other end of the flag, which covers about half a turn, deg. */
const otherEndDeg = 90;

/**
 * A count at which the flag changed, as its distance from the edge, deg: a rotation passes the edge in every turn. Null for the other end of the flag, which
 * a rotation passes as well, and which proves nothing.
 */
function placeInTurn({ context }: Draft, offDeg: number): number | null {
  if (context.step?.row.kind !== 'rotate') return offDeg;
  const placeDeg = offDeg - 360 * Math.round(offDeg / 360);
  return Math.abs(placeDeg) > otherEndDeg ? null : placeDeg;
}

/** Homing has set the count right; where it was off by more than the tolerance, what was counted before is in doubt. */
export function noteHomed(draft: Draft): void {
  const { at } = draft.told('link.homed').link;
  const { position } = draft.context;
  const steps = Math.round((position.homingOffDeg ?? 0) / stepDeg(draft.start.rig)) + 0;
  const slipped = position.proof.slip === null && !isWithin(draft.start.rig, steps);
  if (slipped) noteSlip(draft, { steps, direction: 'ccw', found: 'home' });
  draft.context.position = { proof: homedProof(at), dwells: [], homingOffDeg: null };
}

interface FoundSlip {
  steps: number;
  direction: EdgeDirection;
  found: 'pass' | 'home';
}

/** The alarm: an event that names the dwells in doubt, their marks in the step log, and the words of the hold that follows. */
function noteSlip(draft: Draft, { steps, direction, found }: FoundSlip): void {
  const { rig } = draft.start;
  const { position, step } = draft.context;
  const slipDeg = steps * stepDeg(rig);
  const open = step !== null && step.row.kind === 'dwell' && step.row.outcome === null ? [step.row] : [];
  const doubtful = [...position.dwells, ...open];
  for (const row of doubtful) {
    Object.assign(row, { angleSource: 'counted', uAngleDeg: doubtfulU(rig, row.uAngleDeg, steps) });
    draft.saveRow(row);
    const { pair } = draft.context;
    if (pair.mate?.seq === row.seq) pair.mate = structuredClone(row);
  }
  if (step?.motion != null && step.row.kind !== 'home') saveFacts(draft, step.row);
  draft.log('table-slipped', {
    slipSteps: steps,
    slipDeg,
    toleranceDeg: slipToleranceDeg(rig),
    direction,
    found,
    dwells: doubtful.map(({ seq }) => seq),
  });
  // Who stopped the run stays its reason; the slip stands in the log.
  if (draft.context.intervention?.kind === 'stop') return;
  draft.because(found === 'home' ? 'slip-found-homing' : 'table-slipped', slipWords(steps, slipDeg, { found, dwells: doubtful.length }));
}

function slipWords(steps: number, slipDeg: number, { found, dwells }: { found: 'pass' | 'home'; dwells: number }): string {
  const size = `The table slipped by ${Math.abs(steps)} microsteps (${Math.abs(slipDeg).toFixed(2)}°)`;
  const which = dwells === 1 ? 'The dwell' : `The ${dwells} dwells`;
  const marked = dwells === 0 ? '' : ` ${which} since the last good pass of the home edge ${dwells === 1 ? 'is' : 'are'} marked.`;
  return found === 'home'
    ? `${size} before it was homed.${marked} The count is right again; look at the belt and the motor, then resume.`
    : `${size}, so its count is wrong.${marked} Look at the belt and the motor, stop this run, and home the rig in a new one.`;
}

/** Why a table that has slipped may not be moved by this run; null where it has not. */
export function slipRefusal({ context }: Draft): string | null {
  return context.position.proof.slip === null
    ? null
    : 'The table has slipped, so the count is wrong and this run cannot go on. Stop it, and home the rig in a new run.';
}

export const hasSlipped = ({ context }: Draft): boolean => context.position.proof.slip !== null;

/** Whether the homing that has just ended found the count to be off. */
export const slipFoundHoming = ({ context }: Draft): boolean => context.reason?.code === 'slip-found-homing';

function isHoming({ context }: Draft): boolean {
  return context.step?.row.kind === 'home' && context.step.row.outcome === null;
}

function saveFacts(draft: Draft, row: StepRow): void {
  Object.assign(row, angleFacts(draft));
  draft.saveRow(row);
}
