import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, RepeatStep, Step } from './document';
import { dwellEndUtcMs, homeDurationS, settleEndUtcMs, UnplayableStep, waitUntilLocalTime } from './durations';
import { stationAt } from './stations';
import { moveOf, type StepPart } from './step-parts';
import { waitOf } from './wait';

export type LeafStep = Exclude<Step, RepeatStep>;

/** What a protocol is carried out on. */
export interface CursorPlan {
  protocol: Pick<ProtocolDocument, 'steps' | 'atEnd'>;
  rig: RigDocument;
  /** IANA zone of the lab. */
  timeZone: string;
  /**
   * How long what ends by a condition is taken to last. `expected` (default): a wait as long as the samples it needs, a repeat until a
   * statistical u its greatest number of passes, one that counts good passes as if all were good; `least` and `most`: the bounds.
   */
  conditions?: 'least' | 'expected' | 'most';
  /** From which the order of shuffled repeats is drawn; absent: that of a plan. */
  shuffleSeed?: number;
}

export interface PlanState {
  utcMs: number;
  /** Turntable angle, deg. */
  angleDeg: number;
  /** Start of the swing that has just ended; null when anything else came after it. */
  swingStartUtcMs: number | null;
}

/** A step of the plan, or a part of one. */
export interface StepItem {
  step: LeafStep;
  part?: StepPart;
}

/** A beat counts from the first move of a swing in several. */
function afterPart(part: StepPart, { utcMs, angleDeg, swingStartUtcMs }: PlanState): PlanState {
  if (part.kind === 'move') {
    const beganUtcMs = part.offsetS === 0 ? utcMs : swingStartUtcMs;
    return { utcMs: utcMs + part.durationS * 1000, angleDeg: part.targetDeg, swingStartUtcMs: beganUtcMs };
  }
  const endUtcMs = part.kind === 'pause' && swingStartUtcMs !== null ? swingStartUtcMs + 1000 * part.offsetS : utcMs + 1000 * part.lengthS;
  return { utcMs: Math.max(utcMs, endUtcMs), angleDeg, swingStartUtcMs: part.kind === 'pause' ? swingStartUtcMs : null };
}

/**
 * The state after a step if all goes by plan. A mark and a proof take no time; what a person ends counts as none, a wait for a condition as long as the samples it needs, or as the step's limit where the most is asked for.
 * @throws UnplayableStep where the step cannot be carried out on the rig.
 */
function stateAfter(item: StepItem, plan: Pick<CursorPlan, 'rig' | 'timeZone' | 'conditions'>, state: PlanState): PlanState {
  const { rig, timeZone } = plan;
  const { step, part } = item;
  if (part !== undefined) {
    const after = afterPart(part, state);
    // A rotation is no swing that a beat could count from.
    return step.kind === 'rotate' ? { ...after, swingStartUtcMs: null } : after;
  }
  const at = (utcMs: number, angleDeg = state.angleDeg): PlanState => ({ utcMs, angleDeg, swingStartUtcMs: null });
  const waited = (of: LeafStep) => {
    const wait = waitOf(of);
    return wait === null ? null : state.utcMs + 1000 * (plan.conditions === 'most' ? wait.atMostS : wait.windowS);
  };
  switch (step.kind) {
    case 'home':
      return at(state.utcMs + homeDurationS(rig, state.angleDeg) * 1000, rig.motion?.homeDeg);
    case 'swing': {
      const move = moveOf(item, rig, state.angleDeg);
      return { utcMs: state.utcMs + move.durationS * 1000, angleDeg: move.targetDeg, swingStartUtcMs: state.utcMs };
    }
    case 'dwell':
      return at(dwellEndUtcMs(step, rig, { startUtcMs: state.utcMs, swingStartUtcMs: state.swingStartUtcMs }));
    case 'settle':
      return at(waited(step) ?? settleEndUtcMs(step, state.utcMs));
    case 'prompt':
      return at(state.utcMs + (plan.conditions === 'most' ? 1000 * (step.atMost_s ?? 0) : 0));
    case 'wait':
      if (!('localTime' in step.until)) return at(waited(step) ?? state.utcMs);
      return at(
        waitUntilLocalTime({ localTime: step.until.localTime, timeZone, utcMs: state.utcMs, ifPast: step.until.ifPast ?? 'continue' })
          .endUtcMs,
      );
    default:
      return at(state.utcMs);
  }
}

/**
 * As `stateAfter`, for drafts and for looking ahead: a step that cannot be carried out is passed over, and a beat whose swing is not known
 * counts from its own start, which is the longest it can be.
 */
export function stateAfterIfPossible(
  item: StepItem,
  plan: Pick<CursorPlan, 'rig' | 'timeZone' | 'conditions'>,
  state: PlanState,
): PlanState {
  const { step } = item;
  const beatAlone = step.kind === 'dwell' && step.beat_periods !== undefined && state.swingStartUtcMs === null;
  try {
    return stateAfter(item, plan, beatAlone ? { ...state, swingStartUtcMs: state.utcMs } : state);
  } catch (error) {
    if (error instanceof UnplayableStep) return { ...state, swingStartUtcMs: null };
    throw error;
  }
}

/** Station at which the sources stand in a state: the target's own name after a swing to it, else the first one at that angle. */
export function stationAfter(
  { step, part }: StepItem,
  rig: RigDocument,
  after: { angleDeg: number; stationBefore: string; angleBeforeDeg: number },
): string {
  if (part?.kind === 'move') return part.station;
  if (part === undefined && step.kind === 'swing' && typeof step.to === 'string') return step.to;
  return after.angleDeg === after.angleBeforeDeg ? after.stationBefore : stationAt(rig, after.angleDeg);
}
