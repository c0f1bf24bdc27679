import type { RepeatStep, Step } from './document';
import { nextOccurrenceUtcMs } from './durations';
import { type LeafStep, type CursorPlan, stateAfterIfPossible } from './step-effect';
import { partsIfPossible, type StepPart } from './step-parts';

export type { LeafStep, CursorPlan } from './step-effect';

/** A protocol executes at most this many steps. */
export const greatestStepCount = 10_000;

/** One list of steps being worked through: the outermost one, or that of a repeat. */
interface CursorFrame {
  /** Position (from 0) of the step that comes next. In the frames below the innermost: of the repeat being repeated. */
  next: number;
  /** Pass of the repeat this list belongs to, from 1; 0 for the outermost list. */
  pass: number;
  /** For a repeat until a local time: that instant, fixed when the repeat began. */
  deadlineUtcMs: number | null;
  /** For a repeat that counts good passes: how many so far; absent: as many as passes. */
  good?: number;
  /** A dwell of the present pass was not good. */
  spoilt?: boolean;
}

/** Where a run stands in its protocol. Plain JSON: it is part of the run's snapshot. */
export interface CursorState {
  frames: CursorFrame[];
  /** Steps given out so far. */
  executed: number;
  /** The swing to the station of `atEnd` has been given out. */
  atEndGiven: boolean;
  /** What of a shaped swing or a kick is still to come, as worked out when it began. */
  parts?: PlannedItem[];
}

export interface PlannedItem {
  /** With pass numbers: `2.repeat[3].1.swing`; `atEnd.swing` for the last move. */
  path: string;
  /** As in the document: `2.repeat.1.swing`. */
  documentPath: string;
  step: LeafStep;
  /** What of a step that is made of parts this is. */
  part?: StepPart;
}

export interface CursorMoment {
  utcMs: number;
  /** Turntable angle, deg. */
  angleDeg: number;
  /** The dwell that has just ended was not good. */
  notGood?: boolean;
  /** Relative u of the near−far difference so far; null while it is not known. Absent: a plan, which knows nothing of it. */
  relativeU?: number | null;
}

/** The cursor before the first step. */
export function beginCursor(): CursorState {
  return { frames: [{ next: 0, pass: 0, deadlineUtcMs: null }], executed: 0, atEndGiven: false };
}

/**
 * The next step to execute, and the cursor after it; `item` is null when the protocol is finished. Called once for each executed
 * step, at the moment the step before it ended: that is when a repeat decides whether another pass begins. Pure, so a look ahead
 * is a call whose cursor is dropped.
 * @throws RangeError beyond 10,000 executed steps, and for a repeat that goes round without a step.
 */
export function advanceCursor(
  plan: CursorPlan,
  cursor: CursorState,
  moment: CursorMoment,
): { item: PlannedItem | null; cursor: CursorState } {
  const [part, ...others] = cursor.parts ?? [];
  if (part !== undefined) return { item: part, cursor: { ...cursor, parts: others } };
  const frames = cursor.frames.map((frame) => (moment.notGood === true ? { ...frame, spoilt: true } : { ...frame }));
  for (let decisions = 0; decisions <= greatestStepCount; decisions += 1) {
    const lists = listsOf(plan.protocol.steps, frames);
    const frame = frames[frames.length - 1];
    const step = frame && lists[lists.length - 1]?.[frame.next];
    if (frame === undefined) break;
    if (step === undefined) {
      if (frames.length === 1) return atEnd(plan, { ...cursor, frames });
      const repeat = lists[lists.length - 2]?.[frames[frames.length - 2]?.next ?? -1] as RepeatStep;
      Object.assign(frame, { good: (frame.good ?? frame.pass - 1) + (frame.spoilt === true ? 0 : 1), spoilt: false });
      if (anotherPass(repeat, frame, { plan, moment })) Object.assign(frame, { next: 0, pass: frame.pass + 1 });
      else {
        frames.pop();
        (frames[frames.length - 1] as CursorFrame).next += 1;
      }
    } else if (step.kind === 'repeat') {
      const inner: CursorFrame = { next: 0, pass: 0, deadlineUtcMs: deadlineOf(step, plan, moment) };
      if (step.steps.length > 0 && anotherPass(step, inner, { plan, moment })) frames.push({ ...inner, pass: 1 });
      else frame.next += 1;
    } else {
      const item = itemOf(lists, frames, step);
      frame.next += 1;
      if (cursor.executed >= greatestStepCount) throw new RangeError(`a protocol executes at most ${greatestStepCount} steps`);
      return withParts(plan, moment, { item, cursor: { ...cursor, frames, executed: cursor.executed + 1 } });
    }
  }
  throw new RangeError('a repeat goes round without a step');
}

/** The first part of a step that is made of several; the others come next. */
function withParts(plan: CursorPlan, { angleDeg }: CursorMoment, { item, cursor }: { item: PlannedItem; cursor: CursorState }) {
  const parts = partsIfPossible(item.step, plan.rig, angleDeg)?.map((part): PlannedItem => {
    return { ...item, path: part.kind === 'move' ? `${item.path}.${part.name}` : item.path, part };
  });
  const [first, ...others] = parts ?? [];
  return first === undefined ? { item, cursor } : { item: first, cursor: { ...cursor, parts: others } };
}

/** The lists of steps that the frames work through, outermost first. */
function listsOf(steps: readonly Step[], frames: readonly CursorFrame[]): (readonly Step[])[] {
  const lists = [steps];
  for (const frame of frames.slice(0, -1)) {
    const step = lists[lists.length - 1]?.[frame.next];
    lists.push(step?.kind === 'repeat' ? step.steps : []);
  }
  return lists;
}

function itemOf(lists: readonly (readonly Step[])[], frames: readonly CursorFrame[], step: LeafStep): PlannedItem {
  const parts = frames.map((frame, depth) => {
    const kind = lists[depth]?.[frame.next]?.kind ?? '';
    return { plain: `${frame.next + 1}.${kind}`, pass: frames[depth + 1]?.pass };
  });
  return {
    path: parts.map(({ plain, pass }) => (pass === undefined ? plain : `${plain}[${pass}]`)).join('.'),
    documentPath: parts.map(({ plain }) => plain).join('.'),
    step,
  };
}

function atEnd(plan: CursorPlan, cursor: CursorState): { item: PlannedItem | null; cursor: CursorState } {
  const station = plan.protocol.atEnd?.station;
  if (station === undefined || cursor.atEndGiven) return { item: null, cursor };
  const item: PlannedItem = { path: 'atEnd.swing', documentPath: 'atEnd.swing', step: { kind: 'swing', to: station } };
  return { item, cursor: { ...cursor, executed: cursor.executed + 1, atEndGiven: true } };
}

function deadlineOf(repeat: RepeatStep, plan: CursorPlan, moment: CursorMoment): number | null {
  if (repeat.until === undefined || !('localTime' in repeat.until)) return null;
  return nextOccurrenceUtcMs({ localTime: repeat.until.localTime, timeZone: plan.timeZone, utcMs: moment.utcMs });
}

function anotherPass(repeat: RepeatStep, frame: CursorFrame, context: { plan: CursorPlan; moment: CursorMoment }): boolean {
  if (repeat.atMost !== undefined && frame.pass >= repeat.atMost) return false;
  if (frame.deadlineUtcMs !== null) return passEndsBy(repeat, frame.deadlineUtcMs, context);
  if (repeat.until !== undefined && 'relativeStatisticalU' in repeat.until)
    return frame.pass < leastPasses(repeat) || !isReached(repeat.until.relativeStatisticalU, context);
  if (repeat.counting !== 'good') return frame.pass < (repeat.times ?? 0);
  // The most that may come of it: no pass is good before the last one that is allowed.
  return context.plan.conditions === 'most' || (frame.good ?? frame.pass) < (repeat.times ?? 0);
}

/** Passes of a repeat until a statistical u that are made in any case. */
export const leastPasses = ({ atLeast = 20, atMost }: RepeatStep): number => Math.min(atLeast, atMost ?? atLeast);

function isReached(wanted: number, { plan, moment }: { plan: CursorPlan; moment: CursorMoment }): boolean {
  if (moment.relativeU === undefined) return plan.conditions === 'least';
  return moment.relativeU !== null && moment.relativeU <= wanted;
}

/** An instant taken from the controller's stamps may be off the plan by some µs: so near to the deadline counts as on it, ms. */
const roundingMs = 0.5;

/** Whether a pass of the repeat that began at the moment would end, by plan, no later than the deadline. */
function passEndsBy(repeat: RepeatStep, deadlineUtcMs: number, { plan, moment }: { plan: CursorPlan; moment: CursorMoment }): boolean {
  const passPlan: CursorPlan = { ...plan, protocol: { steps: repeat.steps } };
  let state = { ...moment, swingStartUtcMs: null as number | null };
  let cursor = beginCursor();
  while (state.utcMs <= deadlineUtcMs + roundingMs) {
    const next = advanceCursor(passPlan, cursor, state);
    if (next.item === null) return true;
    cursor = next.cursor;
    state = stateAfterIfPossible(next.item, plan, state);
  }
  return false;
}
