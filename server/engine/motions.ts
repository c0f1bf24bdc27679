import type { StepOutcome } from '@/shared/archive/run-records';
import { advanceCursor } from '@/shared/protocol/cursor';
import { swingMove } from '@/shared/protocol/durations';
import type { Instant } from '../interfaces/clock';
import type { Draft } from './draft';
import { endStanding, openSwing, sendMove, standingEndUtcMs, toleranceDeg, writeMark } from './steps';
import { LATE_MS, MOTION_GRACE_MS } from './timing';

/** How a motion is followed: begun, refused, ended, finished. */

/** The controller began the move that was sent ahead (or must have, unseen): the standing step is over and the swing is the present step. */
export function takeAhead(draft: Draft): void {
  const { context } = draft;
  const { ahead } = context;
  if (ahead === null) return;
  endStanding(draft);
  context.step = null;
  context.ahead = null;
  for (;;) {
    const { item, cursor } = advanceCursor(draft.start, context.cursor, context.moment);
    if (item === null) return;
    context.cursor = cursor;
    if (item.step.kind === 'swing') {
      openSwing(draft, { item, commandId: ahead.commandId, startUtcMs: ahead.startUtcMs, late: false });
      noteBegan(draft);
      return;
    }
    writeMark(draft, item);
  }
}

/** The controller's stamp of the beginning goes into the row; from it a beat is counted. */
export function noteBegan(draft: Draft): void {
  const { context, event } = draft;
  const { step } = context;
  if (step?.motion == null) return;
  const seen = event.type === 'link.motion-began';
  const stamp = seen ? draft.stamp : { utcMs: step.motion.startUtcMs ?? step.row.startUtcMs, uS: context.uPlanS };
  step.motion.began = true;
  context.moveRetries = 0;
  context.uPlanS = stamp.uS;
  if (context.onCadence && stamp.utcMs - step.row.plannedStartUtcMs > LATE_MS) step.motion.late = true;
  Object.assign(step.row, { startUtcMs: stamp.utcMs, uStartS: stamp.uS });
  if (seen && event.link.angleDeg !== null) step.row.angleStartDeg = event.link.angleDeg;
  if (step.row.kind === 'swing') context.swingStartUtcMs = stamp.utcMs;
  draft.saveRow(step.row);
  confirmResume(draft);
}

/** From its beginning on, a motion may take as long as its profile and some grace. */
export function expectEnd(draft: Draft): void {
  const { step } = draft.context;
  if (step?.motion != null) draft.context.deadlineUtcMs = draft.stamp.utcMs + step.motion.durationMs + MOTION_GRACE_MS;
}

/** The controller refused or cancelled the move that was sent ahead: it is made at once when the step ends. */
export function dropAhead(draft: Draft): void {
  const { context } = draft;
  context.ahead = null;
  context.moveRetries += 1;
  if (context.step !== null) context.deadlineUtcMs = standingEndUtcMs(context.step);
}

/** The controller could not take the motion just now: it is asked again, under a new id. */
export function askAgain(draft: Draft): void {
  const { context, start } = draft;
  const { step } = context;
  if (step?.motion == null) return;
  context.moveRetries += 1;
  if (step.item.step.kind !== 'swing') {
    step.motion.commandId = draft.command((id) => ({ kind: 'home', id }));
    return;
  }
  step.motion.commandId = sendMove(draft, swingMove(step.item.step, start.rig, context.moment.angleDeg), null);
}

function confirmResume(draft: Draft): void {
  const { intervention } = draft.context;
  if (intervention?.kind === 'resume' && intervention.confirmedAtUtcMs === null) intervention.confirmedAtUtcMs = draft.stamp.utcMs;
}

/** The motion is over, as planned or not: the row gets the controller's stamp and the achieved angle, and stays open. */
export function noteEnded(draft: Draft): void {
  const { context, stamp, event } = draft;
  if (event.type !== 'link.motion-ended' && event.type !== 'link.homed') return;
  const { angleDeg } = event.link;
  context.uPlanS = stamp.uS;
  if (context.controller !== null) Object.assign(context.controller, { moving: false, angleDeg, positionKnown: angleDeg !== null });
  const { step } = context;
  if (step?.motion == null) return;
  step.motion.ended = true;
  Object.assign(step.row, { endUtcMs: stamp.utcMs, uEndS: stamp.uS, angleEndDeg: angleDeg });
}

/** The motion ended where it should: the row is done and the sources stand. */
export function finishMotion(draft: Draft): void {
  const { step, moment } = draft.context;
  if (step?.motion == null) return;
  const { row, motion } = step;
  const at: Instant = { utcMs: row.endUtcMs ?? draft.stamp.utcMs, uS: row.uEndS ?? draft.stamp.uS };
  const outcome: StepOutcome = motion.late ? 'late' : 'done';
  if (row.kind === 'home') row.angleSource = 'edge-verified';
  draft.closeRow({ at, angleDeg: row.angleEndDeg, outcome });
  draft.standAt(at, row.angleEndDeg ?? moment.angleDeg);
  draft.context.onCadence = false;
}

/** Whether the motion that was noted as ended reached what it was sent to. */
export function reachedTarget(draft: Draft): boolean {
  const { step } = draft.context;
  const angleDeg = step?.row.angleEndDeg ?? null;
  if (step?.motion == null || angleDeg === null) return false;
  return step.motion.targetDeg === null || Math.abs(angleDeg - step.motion.targetDeg) <= toleranceDeg(draft);
}
