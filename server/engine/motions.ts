import type { StepOutcome, StepRow } from '@/shared/archive/run-records';
import { advanceCursor } from '@/shared/protocol/cursor';
import type { Step } from '@/shared/protocol/document';
import { moveOf } from '@/shared/protocol/step-parts';
import type { Instant } from '../interfaces/clock';
import type { MotionSent } from '../interfaces/turntable-link';
import type { Draft } from './draft';
import { heedFinishing } from './finishing';
import type { RunSnapshot } from './run-context';
import { noteOrders } from './orders';
import { forgetPosition, noteHomed } from './position';
import { cursorMoment } from './dwells';
import { toleranceDeg } from './rows';
import { endStanding, openSwing, sendMove, standingEndUtcMs, writeMark } from './steps';
import { LATE_MS, motionGraceMs } from './timing';

/** How a motion is followed: begun, refused, ended, finished. */

/** The controller's clock is told in whole microseconds. */
const STAMP_ROUNDING_MS = 0.001;

/** The controller began the move that was sent ahead (or must have, unseen): the standing step is over and the swing is the present step. */
export function takeAhead(draft: Draft): void {
  const { context } = draft;
  const { ahead } = context;
  if (ahead === null) return;
  endStanding(draft);
  context.step = null;
  context.ahead = null;
  for (;;) {
    const { item, cursor, drawn } = advanceCursor(draft.start, context.cursor, cursorMoment(draft));
    context.dwellJustNotGood = false;
    if (item === null) return;
    context.cursor = cursor;
    noteOrders(draft, drawn);
    if (item.part?.kind === 'move' || (item.part === undefined && item.step.kind === 'swing')) {
      openSwing(draft, { item, commandId: ahead.commandId, startUtcMs: ahead.startUtcMs, late: false });
      noteBegan(draft);
      heedFinishing(context);
      return;
    }
    writeMark(draft, item);
  }
}

/** The controller's stamp of the beginning goes into the row; from it a beat is counted. */
export function noteBegan(draft: Draft): void {
  const { context, event } = draft;
  const { step, motion } = draft;
  const seen = event.type === 'link.motion-began';
  // Told again, as to a server that takes the run up and does not know the controller's clock as well yet.
  if (seen && motion.began && draft.stamp.uS >= step.row.uStartS) return;
  const stamp = seen ? inOrder(draft.stamp, step.row) : unseenBeginning(draft);
  motion.began = true;
  draft.controller.warningDue = false;
  context.moveRetries = 0;
  context.uPlanS = stamp.uS;
  if (context.onCadence && stamp.utcMs - step.row.plannedStartUtcMs > LATE_MS) motion.late = true;
  Object.assign(step.row, { startUtcMs: stamp.utcMs, uStartS: stamp.uS });
  if (seen && event.link.angleDeg !== null) step.row.angleStartDeg = event.link.angleDeg;
  noteSwingStart(draft, stamp.utcMs);
  draft.saveRow(step.row);
  confirmResume(draft);
}

/** A beat counts from the first move of a swing; where a later one came late, as if the first had been late as well. None counts from a rotation. */
function noteSwingStart({ context, step, motion }: Draft, beganUtcMs: number): void {
  if (step.row.kind === 'home') return;
  if (step.row.kind === 'rotate') {
    context.swingStartUtcMs = null;
    return;
  }
  const { part } = step.item;
  const offsetMs = part?.kind === 'move' ? 1000 * part.offsetS : 0;
  if (offsetMs === 0 || motion.late || context.swingStartUtcMs === null) context.swingStartUtcMs = beganUtcMs - offsetMs;
}

/**
 * An edge of a motion that the controller never told of, nor keeps any more: it lies somewhere between two instants. The earlier one is taken, with an
 * uncertainty that reaches the other (a rectangle about its end: width / √3), and the log says that it was not measured.
 */
export function untoldEdge(draft: Draft, edge: 'began' | 'ended', span: { fromUtcMs: number; toUtcMs: number }): Instant {
  const { seq, path } = draft.step.row;
  const spanS = Math.max(0, span.toUtcMs - span.fromUtcMs) / 1000;
  draft.log('edge-not-told', { seq, path, edge, spanS });
  return { utcMs: span.fromUtcMs, uS: Math.hypot(draft.context.uPlanS, spanS / Math.sqrt(3)) };
}

/** Not before its time, and not so late that the profile could not have passed. */
function unseenBeginning(draft: Draft): Instant {
  const { step, motion, stamp, event } = draft;
  const fromUtcMs = motion.startUtcMs ?? step.row.startUtcMs;
  const ended = event.type === 'link.motion-ended' && event.link.cause === 'done' && step.row.kind !== 'home';
  const toUtcMs = ended ? stamp.utcMs - motion.durationMs : draft.nowUtcMs;
  return untoldEdge(draft, 'began', { fromUtcMs, toUtcMs });
}

/** Whether the motion that has ended ever began: a waiting move that is cancelled ends where it stood. */
function hasMoved(draft: Draft, angleDeg: number | null): boolean {
  const { event, step, context } = draft;
  if (event.type === 'link.homed') return true;
  if (event.type === 'link.motion-ended' && event.link.cause === 'done') return true;
  const fromDeg = step.row.angleStartDeg ?? context.moment.angleDeg;
  return angleDeg !== null && Math.abs(angleDeg - fromDeg) > toleranceDeg(draft);
}

/** No timed motion begins before its time: a stamp that says so by no more than its own uncertainty means that time. */
function inOrder(stamp: Instant, { plannedStartUtcMs }: StepRow): Instant {
  const early = plannedStartUtcMs - stamp.utcMs;
  return early > 0 && early <= STAMP_ROUNDING_MS + 3000 * stamp.uS ? { ...stamp, utcMs: plannedStartUtcMs } : stamp;
}

/** From its beginning on, a motion may take as long as its profile and some grace. */
export function expectEnd(draft: Draft): void {
  const { durationMs } = draft.motion;
  draft.context.deadlineUtcMs = draft.stamp.utcMs + durationMs + motionGraceMs(durationMs);
}

/** The controller refused or cancelled the move that was sent ahead: it is made at once when the step ends. */
export function dropAhead(draft: Draft): void {
  const { context } = draft;
  context.ahead = null;
  context.moveRetries += 1;
  context.deadlineUtcMs = standingEndUtcMs(draft.step);
}

/** The controller could not take the motion just now: it is asked again, under a new id. */
export function askAgain(draft: Draft): void {
  const { context, start, motion } = draft;
  context.moveRetries += 1;
  motion.commandId =
    draft.step.row.kind === 'home'
      ? draft.command((id) => ({ kind: 'home', id }))
      : sendMove(draft, moveOf(draft.step.item, start.rig, context.moment.angleDeg), null);
}

function confirmResume(draft: Draft): void {
  const { intervention } = draft.context;
  const moves = intervention?.kind === 'resume' || intervention?.kind === 'skip';
  if (moves && intervention.confirmedAtUtcMs === null) intervention.confirmedAtUtcMs = draft.stamp.utcMs;
}

/** The motion is over, as planned or not: the row gets the controller's stamp and the achieved angle, and stays open. */
export function noteEnded(draft: Draft): void {
  const { context, stamp, event, step, motion } = draft;
  const ending = event.type === 'link.homed' ? { angleDeg: event.link.angleDeg, cause: 'done' } : draft.told('link.motion-ended').link;
  const { angleDeg } = ending;
  if (!motion.began && hasMoved(draft, angleDeg)) noteBegan(draft);
  context.uPlanS = stamp.uS;
  Object.assign(draft.controller, { moving: false, angleDeg, positionKnown: angleDeg !== null });
  motion.reached = ending.cause === 'done';
  Object.assign(step.row, { endUtcMs: stamp.utcMs, uEndS: stamp.uS, angleEndDeg: angleDeg });
  if (event.type === 'link.homed') noteHomed(draft);
  else if (angleDeg === null) forgetPosition(draft);
}

/** The motion ended where it should: the row is done and the sources stand. */
export function finishMotion(draft: Draft): void {
  const { moment } = draft.context;
  const { motion } = draft;
  const { row } = draft.step;
  const at: Instant = { utcMs: row.endUtcMs ?? draft.stamp.utcMs, uS: row.uEndS ?? draft.stamp.uS };
  const outcome: StepOutcome = motion.late ? 'late' : 'done';
  draft.closeRow({ at, angleDeg: row.angleEndDeg, outcome });
  draft.standAt(at, row.angleEndDeg ?? moment.angleDeg);
  draft.context.station = row.station;
  draft.context.onCadence = false;
  draft.context.swungFromDeg = isPlain(draft.step.item.step) && outcome === 'done' ? row.angleStartDeg : null;
}

/** A shaped swing leaves the pendulum nearly at rest on purpose. */
const isPlain = (step: Step): boolean => step.kind === 'swing' && step.profile !== 'shaped';

/** Whether the motion reached what it was sent to: the controller said so, or the sources stand there. */
export function reachedTarget(draft: Draft): boolean {
  const { targetDeg, reached } = draft.motion;
  if (reached) return true;
  const { angleEndDeg } = draft.step.row;
  return angleEndDeg !== null && targetDeg !== null && Math.abs(angleEndDeg - targetDeg) <= toleranceDeg(draft);
}

/** What was sent to the controller and has not been told to be over. */
export function openMotions({ context: { step, ahead } }: Pick<RunSnapshot, 'context'>): MotionSent[] {
  const motion = step === null || step.broken || step.row.endUtcMs !== null ? null : step.motion;
  return [
    ...(motion === null || step === null
      ? []
      : [{ kind: step.row.kind === 'home' ? ('home' as const) : ('move' as const), id: motion.commandId }]),
    ...(ahead === null ? [] : [{ kind: 'move' as const, id: ahead.commandId }]),
  ];
}
