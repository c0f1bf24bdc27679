import { advanceCursor, type CursorMoment, type PlannedItem } from '@/shared/protocol/cursor';
import type { Step } from '@/shared/protocol/document';
import {
  dwellEndUtcMs,
  homeDurationS,
  motionOf,
  settleEndUtcMs,
  type SwingMove,
  UnplayableStep,
  waitUntilLocalTime,
} from '@/shared/protocol/durations';
import { homingObstacle } from '@/shared/protocol/homing';
import { pathObstacles } from '@/shared/protocol/motion-path';
import { rotationRefusals } from '@/shared/protocol/rotation';
import { stationAt } from '@/shared/protocol/stations';
import type { PassOrder } from '@/shared/protocol/shuffle';
import { moveOf, partsOf, rotationHomeDeg } from '@/shared/protocol/step-parts';
import { waitOf } from '@/shared/protocol/wait';
import type { Instant } from '../interfaces/clock';
import { beginAwaiting } from './awaiting';
import { cursorMoment, holdOfDwells, lookAtDwell } from './dwells';
import type { Draft } from './draft';
import { noteOrders } from './orders';
import { heedFinishing } from './finishing';
import { homingLimitMs } from './homing-limit';
import { runProof } from './proofs';
import { newRow, stationOf, toleranceDeg } from './rows';
import type { ActiveStep, Motion, RunContext } from './run-context';
import { BEGIN_GRACE_MS, LEAD_MS, LEAST_LEAD_MS, LOOK_LEAD_MS, motionGraceMs } from './timing';

/** How steps begin and end: the actions of the chart that follow the protocol. */

/** Takes the next step of the protocol and begins it; marks are written in passing. */
export function chooseNext(draft: Draft): void {
  chooseAfter(draft, false);
}

/** As `chooseNext`; `late`: a move that comes now comes after its time. */
export function chooseAfter(draft: Draft, late: boolean): void {
  const { context } = draft;
  context.step = null;
  context.ahead = null;
  context.moveRetries = 0;
  heedFinishing(context);
  for (;;) {
    const next = nextItem(draft, { cursor: context.cursor, moment: cursorMoment(draft) });
    if (next === null) {
      context.next = 'failed';
      return;
    }
    const { item, cursor, drawn } = next;
    if (item === null) {
      context.cursor = cursor;
      context.next = 'finished';
      return;
    }
    if (!isWithin(item) && holdIsDue(draft)) {
      context.next = 'holding';
      return;
    }
    context.cursor = cursor;
    noteOrders(draft, drawn);
    // Not before: a hold between two steps must not make a pass good that was not.
    context.dwellJustNotGood = false;
    if (item.step.kind === 'mark') writeMark(draft, item);
    else if (item.step.kind === 'proof') {
      const halt = runProof(draft, item);
      if (halt !== null) {
        context.next = halt;
        return;
      }
    } else return beginItem(draft, { item, late });
  }
}

/** A step that was begun goes on to its end before a hold between steps counts. */
const isWithin = ({ part }: PlannedItem): boolean => part !== undefined && !(part.kind === 'move' && part.offsetS === 0);

/** The step after the cursor; null with the reason set where a protocol goes on for ever. */
function nextItem(
  draft: Draft,
  { cursor, moment }: Pick<RunContext, 'cursor'> & { moment: CursorMoment },
): ReturnType<typeof advanceCursor> | null {
  try {
    return advanceCursor(draft.start, cursor, moment);
  } catch (error) {
    if (!(error instanceof RangeError)) throw error;
    draft.because('too-many-steps', `The protocol goes on for ever: ${error.message}.`);
    return null;
  }
}

/** Whether the run is to hold between two steps; sets the reason. */
function holdIsDue(draft: Draft): boolean {
  const { holdAfterStep, moment } = draft.context;
  if (holdAfterStep !== null) {
    explainHoldAfterStep(draft);
    return true;
  }
  const asked = holdOfDwells(draft);
  if (asked !== null) {
    draft.context.heldForDwell = asked.seq;
    draft.because(asked.code, asked.text);
    return true;
  }
  if (!armHasEnded(draft, moment.utcMs)) return false;
  draft.because('arm-ended', `The arm of ${draft.context.arm?.name ?? 'the rig'} has ended. Arm the rig again on site, then resume.`);
  return true;
}

export const explainHoldAfterStep = (draft: Draft): void =>
  void draft.because('hold-after-dwell', `${draft.context.holdAfterStep ?? 'Somebody'} asked to hold when the step had ended.`);

function armHasEnded(draft: Draft, atUtcMs: number): boolean {
  const { arm } = draft.context;
  return draft.start.simulated === null && arm !== null && arm.untilUtcMs <= atUtcMs;
}

export function writeMark(draft: Draft, item: PlannedItem): void {
  const { context } = draft;
  const { moment } = context;
  const row = newRow(draft, { item, station: stationOf(draft), endUtcMs: moment.utcMs });
  draft.openStep({ item, row, plannedMs: 0, motion: null, broken: false });
  draft.closeRow({ at: moment, angleDeg: row.angleStartDeg, outcome: 'done' });
  context.step = null;
}

/** Begins a step at the present moment; one that this rig cannot carry out fails the run with a sentence. */
function beginItem(draft: Draft, { item, late }: SwingStart): void {
  try {
    beginKind(draft, { item, late });
  } catch (error) {
    if (!(error instanceof UnplayableStep)) throw error;
    draft.because(error.code, `Step ${item.path}: ${error.message}`);
    draft.context.next = 'failed';
  }
}

function beginKind(draft: Draft, { item, late }: SwingStart): void {
  const { step, part } = item;
  if (part !== undefined) return part.kind === 'move' ? beginSwing(draft, { item, late }) : beginStanding(draft, item);
  // Parts that could not be worked out: why is said here.
  partsOf(step, draft.start.rig, draft.context.moment.angleDeg);
  switch (step.kind) {
    case 'home':
      return beginHome(draft, item);
    case 'swing':
      return beginSwing(draft, { item, late: false });
    case 'prompt':
      return beginAwaiting(draft, item);
    case 'dwell':
    case 'settle':
    case 'wait':
      return waitOf(item.step) === null ? beginStanding(draft, item) : beginAwaiting(draft, item);
    default:
      draft.because('not-yet', `Step ${item.path}: ${item.step.kind} cannot be run by this version; issue a revision without it.`);
      draft.context.next = 'failed';
  }
}

export function beginHome(draft: Draft, item: PlannedItem): void {
  const { context, start } = draft;
  const motionLimits = motionOf(start.rig);
  const obstacle = homingObstacle(start.rig, draft.controller.positionKnown ? draft.controller.angleDeg : null);
  if (obstacle !== null) {
    draft.because('home-refused', `Step ${item.path}: the rig does not home by itself, because ${obstacle}. Turn it to the edge by hand.`);
    context.next = 'failed';
    return;
  }
  const durationMs = 1000 * homeDurationS(start.rig, context.moment.angleDeg);
  const row = newRow(draft, { item, station: stationAt(start.rig, motionLimits.homeDeg), endUtcMs: context.moment.utcMs + durationMs });
  const commandId = draft.command((id) => ({ kind: 'home', id }));
  const motion = {
    commandId,
    targetDeg: null,
    startUtcMs: null,
    durationMs: homingLimitMs(motionLimits, durationMs),
    late: false,
    began: false,
    reached: false,
  };
  draft.openStep({ item, row, plannedMs: null, motion, broken: false });
  context.swingStartUtcMs = null;
  context.deadlineUtcMs = draft.nowUtcMs + motion.durationMs + motionGraceMs(motion.durationMs);
  context.next = 'homing';
}

export interface SwingStart {
  item: PlannedItem;
  /** The move is made later than the plan wanted: after a hold or an interruption. */
  late: boolean;
}

/** Sends the move at once: there was no dwell before it from whose end it could be timed. */
export function beginSwing(draft: Draft, { item, late }: SwingStart): void {
  const { context } = draft;
  if (!draft.controller.positionKnown) {
    draft.because(
      'position-unknown',
      `Step ${item.path}: the position of the turntable is not known. Begin the protocol with a home step.`,
    );
    context.next = 'failed';
    return;
  }
  const move = moveOf(item, draft.start.rig, context.moment.angleDeg);
  const refused = moveRefusal(draft, item, move);
  if (refused !== null) {
    draft.because('path-blocked', `Step ${item.path}: ${refused}`);
    context.next = 'failed';
    return;
  }
  const commandId = sendMove(draft, move, null);
  openSwing(draft, { item, commandId, startUtcMs: null, late });
  context.deadlineUtcMs = draft.nowUtcMs + 1000 * move.durationS + motionGraceMs(1000 * move.durationS);
  context.next = 'moving';
}

/**
 * The limits are kept here too, whatever was checked before, those of a rotation for either of its moves; a counted angle may be off by half a
 * step of the motor. A sentence; null where the move is free.
 */
function moveRefusal(draft: Draft, item: PlannedItem, { targetDeg }: SwingMove): string | null {
  const motion = motionOf(draft.start.rig);
  const homeDeg = rotationHomeDeg(item);
  if (homeDeg !== null && item.step.kind === 'rotate') return rotationRefusals(item.step, motion, homeDeg)[0]?.message ?? null;
  const { angleDeg } = draft.context.moment;
  const wayDeg = targetDeg - angleDeg;
  const fromDeg = angleDeg + Math.sign(wayDeg) * Math.min(Math.abs(wayDeg), toleranceDeg(draft));
  const [met] = pathObstacles(motion, fromDeg, targetDeg);
  return met === undefined ? null : `the move is refused because ${met.reason}.`;
}

export function sendMove(draft: Draft, { targetDeg, speedDegS, accelerationDegS2 }: SwingMove, startUtcMs: number | null): string {
  return draft.command((id) => ({ kind: 'move', id, targetDeg, speedDegS, accelerationDegS2, startUtcMs }));
}

interface SwingOpening extends SwingStart {
  commandId: string;
  startUtcMs: number | null;
}

export function openSwing(draft: Draft, { item, commandId, startUtcMs, late }: SwingOpening): void {
  const { context } = draft;
  const move = moveOf(item, draft.start.rig, context.moment.angleDeg);
  const durationMs = 1000 * move.durationS;
  const row = newRow(draft, { item, station: move.station, endUtcMs: context.moment.utcMs + durationMs });
  const motion: Motion = { commandId, targetDeg: move.targetDeg, startUtcMs, durationMs, late, began: false, reached: false };
  draft.openStep({ item, row, plannedMs: durationMs, motion, broken: false });
}

/** Begins a dwell, settle or wait; `plannedMs` where it begins anew after a hold and lasts as long as first planned. */
export function beginStanding(draft: Draft, item: PlannedItem, plannedMs: number | null = null): void {
  const { context, start } = draft;
  const { moment } = context;
  const end = plannedMs === null ? standingEnd(draft, item) : { endUtcMs: moment.utcMs + plannedMs, holds: false };
  const row = newRow(draft, { item, station: stationOf(draft), endUtcMs: end.endUtcMs });
  const pause = item.part?.kind === 'pause' ? { pause: true } : {};
  draft.openStep({ item, row, plannedMs: end.endUtcMs - moment.utcMs, motion: null, broken: false, ...pause });
  context.deadlineUtcMs = Math.max(moment.utcMs, end.endUtcMs - firstLeadMs(item.step.kind));
  context.next = 'standing';
  if (!end.holds) return;
  draft.closeRow({ at: moment, angleDeg: row.angleStartDeg, outcome: 'done' });
  context.step = null;
  draft.because('wait-past', `Step ${item.path}: ${describeTime(item.step)} in ${start.timeZone} was already past.`);
  context.next = 'holding';
}

/** A dwell is judged a little before the next move is sent, for it may decide whether there is one. */
export const firstLeadMs = (kind: string): number => (kind === 'dwell' ? LOOK_LEAD_MS : LEAD_MS);

/** Time to judge the dwell that ends soon. */
export function lookIsDue(draft: Draft): boolean {
  const { step, judging } = draft.context;
  return step?.row.kind === 'dwell' && judging !== step.row.seq && standingEndUtcMs(step) - draft.nowUtcMs > LEAST_LEAD_MS;
}

export function lookBeforeEnd(draft: Draft): void {
  lookAtDwell(draft, standingEndUtcMs(draft.step));
  draft.context.deadlineUtcMs = Math.max(draft.nowUtcMs, standingEndUtcMs(draft.step) - LEAD_MS);
}

function describeTime(step: Step): string {
  return step.kind === 'wait' && 'localTime' in step.until ? step.until.localTime : 'the time';
}

function standingEnd(draft: Draft, { step, part }: PlannedItem): { endUtcMs: number; holds: boolean } {
  const { moment, swingStartUtcMs } = draft.context;
  const { rig, timeZone } = draft.start;
  if (part?.kind === 'ring-down') return { endUtcMs: moment.utcMs + 1000 * part.lengthS, holds: false };
  if (part?.kind === 'pause') {
    const plannedUtcMs = swingStartUtcMs === null ? moment.utcMs + 1000 * part.lengthS : swingStartUtcMs + 1000 * part.offsetS;
    return { endUtcMs: Math.max(moment.utcMs, plannedUtcMs), holds: false };
  }
  if (step.kind === 'dwell') return { endUtcMs: dwellEndUtcMs(step, rig, { startUtcMs: moment.utcMs, swingStartUtcMs }), holds: false };
  if (step.kind === 'settle') return { endUtcMs: settleEndUtcMs(step, moment.utcMs), holds: false };
  if (step.kind === 'wait' && 'localTime' in step.until) {
    const { localTime, ifPast = 'continue' } = step.until;
    const { endUtcMs, past } = waitUntilLocalTime({ localTime, ifPast, timeZone, utcMs: moment.utcMs });
    return { endUtcMs, holds: past && ifPast === 'hold' };
  }
  return { endUtcMs: moment.utcMs, holds: false };
}

export function standingEndUtcMs(step: ActiveStep): number {
  return step.row.plannedEndUtcMs ?? step.row.startUtcMs;
}

/** A standing step ends at its planned instant, whenever the server gets round to saying so. */
export function endStanding(draft: Draft): void {
  const { step, uPlanS, moment } = draft.context;
  if (step === null) return;
  const at: Instant = { utcMs: standingEndUtcMs(step), uS: uPlanS };
  draft.closeRow({ at, angleDeg: step.row.angleStartDeg, outcome: 'done' });
  draft.standAt(at, moment.angleDeg);
  Object.assign(draft.context, { onCadence: true, swungFromDeg: null, ...(step.pause === true ? {} : { swingStartUtcMs: null }) });
}

/**
 * Shortly before a standing step ends: if a swing follows, sends its move with the end as the controller's start time,
 * so that no jitter of the server reaches the cadence. Otherwise waits for the end.
 */
export function sendAhead(draft: Draft): void {
  const { context } = draft;
  const { step } = context;
  if (step === null) return;
  const endUtcMs = standingEndUtcMs(step);
  context.deadlineUtcMs = endUtcMs;
  heedFinishing(context);
  if (endUtcMs - draft.nowUtcMs < LEAST_LEAD_MS || context.moveRetries > 0) return;
  const holds = context.holdAfterStep !== null || holdOfDwells(draft) !== null || armHasEnded(draft, endUtcMs);
  if ((holds && step.pause !== true) || !draft.controller.positionKnown) return;
  const next = peekMove(draft, endUtcMs);
  if (next === null) return;
  const move = moveOf(next.item, draft.start.rig, context.moment.angleDeg);
  if (moveRefusal(draft, next.item, move) !== null) return;
  noteOrders(draft, next.drawn);
  const commandId = sendMove(draft, move, endUtcMs);
  context.ahead = { commandId, targetDeg: move.targetDeg, startUtcMs: endUtcMs, cancelled: false };
  context.deadlineUtcMs = endUtcMs + BEGIN_GRACE_MS;
}

/** The move that follows at `utcMs`, looking through marks, or null where something else follows. */
function peekMove(draft: Draft, utcMs: number): { item: PlannedItem; drawn: PassOrder[] } | null {
  let { cursor } = draft.context;
  const drawn: PassOrder[] = [];
  let moment: CursorMoment = cursorMoment(draft, utcMs);
  for (;;) {
    const next = nextItem(draft, { cursor, moment });
    moment = { ...moment, notGood: false };
    if (next?.item == null) return null;
    drawn.push(...(next.drawn ?? []));
    if (isMove(next.item, draft)) return { item: next.item, drawn };
    if (next.item.step.kind !== 'mark') return null;
    cursor = next.cursor;
  }
}

/** A swing, or the first move of one that is made of parts; not where these could not be worked out. */
function isMove({ step, part }: PlannedItem, draft: Draft): boolean {
  if (part !== undefined) return part.kind === 'move';
  if (step.kind !== 'swing') return false;
  try {
    return partsOf(step, draft.start.rig, draft.context.moment.angleDeg) === null;
  } catch (error) {
    if (error instanceof UnplayableStep) return false;
    throw error;
  }
}
