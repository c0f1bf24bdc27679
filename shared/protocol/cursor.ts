import type { RepeatStep, Step } from './document';
import { nextOccurrenceUtcMs } from './durations';
import { numberAt, orderedPass, type OrderedSteps, type PassOrder } from './shuffle';
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
  /**
   * The run is to be over by then, UTC ms: of a repeat that makes pairs no pass begins after which it would not be. 0: none begins at all. A pair
   * lies within one pass, so the run ends on a whole one. Absent: it goes on to the end of its protocol.
   */
  finishByUtcMs?: number;
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
export function advanceCursor(plan: InnerPlan, cursor: CursorState, moment: CursorMoment): CursorAdvance {
  const [part, ...others] = cursor.parts ?? [];
  if (part !== undefined) return { item: part, cursor: { ...cursor, parts: others } };
  const frames = cursor.frames.map((frame) => (moment.notGood === true ? { ...frame, spoilt: true } : { ...frame }));
  const drawn: PassOrder[] = [];
  for (let decisions = 0; decisions <= greatestStepCount; decisions += 1) {
    const lists = listsOf(plan, frames);
    const frame = frames[frames.length - 1];
    const list = lists[lists.length - 1];
    const step = frame && list?.steps[frame.next];
    if (frame === undefined || list === undefined) break;
    if (step === undefined) {
      const outer = lists[lists.length - 2];
      const place = frames[frames.length - 2]?.next ?? -1;
      if (outer === undefined) return atEnd(plan, { ...cursor, frames });
      const repeat = outer.steps[place] as RepeatStep;
      Object.assign(frame, { good: (frame.good ?? frame.pass - 1) + (frame.spoilt === true ? 0 : 1), spoilt: false });
      const next = passAt(outer, place, { repeat, pass: frame.pass + 1, plan });
      const again = { ...cursor, frames: [...frames.slice(0, -1), { ...frame, next: 0, pass: frame.pass + 1 }] };
      if (anotherPass(repeat, frame, { plan, moment, next, again })) {
        Object.assign(frame, { next: 0, pass: frame.pass + 1 });
        drawn.push(...orderOf(next));
      } else {
        frames.pop();
        (frames[frames.length - 1] as CursorFrame).next += 1;
      }
    } else if (step.kind === 'repeat') {
      const inner: CursorFrame = { next: 0, pass: 0, deadlineUtcMs: deadlineOf(step, plan, moment) };
      const next = passAt(list, frame.next, { repeat: step, pass: 1, plan });
      const again = { ...cursor, frames: [...frames, { ...inner, pass: 1 }] };
      if (step.steps.length > 0 && anotherPass(step, inner, { plan, moment, next, again })) {
        frames.push({ ...inner, pass: 1 });
        drawn.push(...orderOf(next));
      } else frame.next += 1;
    } else {
      const item = itemOf(lists, frames, step);
      frame.next += 1;
      if (cursor.executed >= greatestStepCount) throw new RangeError(`a protocol executes at most ${greatestStepCount} steps`);
      const given = withParts(plan, moment, { item, cursor: { ...cursor, frames, executed: cursor.executed + 1 } });
      return drawn.length === 0 ? given : { ...given, drawn };
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

/** A list of steps being worked through. */
interface List extends OrderedSteps {
  /** Path of the pass, `2.repeat[3]`; empty for the outermost list. */
  path: string;
}

/** A plan of which only one pass of a repeat is carried out: its steps have the paths and orders that they have in the whole. */
interface InnerPlan extends CursorPlan {
  within?: List;
}

interface CursorAdvance {
  item: PlannedItem | null;
  cursor: CursorState;
  /** The shuffled passes that begin with this step, outermost first; absent: none. */
  drawn?: PassOrder[];
}

/** The lists of steps that the frames work through, outermost first. */
function listsOf(plan: InnerPlan, frames: readonly CursorFrame[]): List[] {
  const lists = [plan.within ?? { path: '', steps: plan.protocol.steps, order: null }];
  for (const [depth, { next }] of frames.slice(0, -1).entries()) {
    const list = lists[depth] as List;
    const step = list.steps[next];
    const pass = frames[depth + 1]?.pass ?? 1;
    lists.push(step?.kind === 'repeat' ? passAt(list, next, { repeat: step, pass, plan }) : { path: '', steps: [], order: null });
  }
  return lists;
}

/** The steps of one pass of the repeat at a place of a list. */
function passAt(list: List, place: number, { repeat, pass, plan }: { repeat: RepeatStep; pass: number; plan: CursorPlan }): List {
  const path = `${list.path === '' ? '' : `${list.path}.`}${numberAt(list, place)}.repeat[${pass}]`;
  return { path, ...orderedPass(repeat, path, plan.shuffleSeed) };
}

const orderOf = ({ path, order }: List): PassOrder[] => (order === null ? [] : [{ path, order: order.map((place) => place + 1) }]);

function itemOf(lists: readonly List[], frames: readonly CursorFrame[], step: LeafStep): PlannedItem {
  const list = lists[lists.length - 1] as List;
  const plain = `${numberAt(list, frames[frames.length - 1]?.next ?? 0)}.${step.kind}`;
  const path = list.path === '' ? plain : `${list.path}.${plain}`;
  return { path, documentPath: path.replace(/\[\d+\]/g, ''), step };
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

interface Passing {
  plan: CursorPlan;
  moment: CursorMoment;
  /** The pass in question. */
  next: List;
  /** The cursor where it begins. */
  again: CursorState;
}

function anotherPass(repeat: RepeatStep, frame: CursorFrame, context: Passing): boolean {
  if (makesPairs(repeat) && !finishesInTime(context)) return false;
  if (repeat.atMost !== undefined && frame.pass >= repeat.atMost) return false;
  if (frame.deadlineUtcMs !== null) return passEndsBy(frame.deadlineUtcMs, context);
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

/** Where the swings of some steps go, those within repeats too; a rotation goes everywhere. */
const targetsOf = (steps: readonly Step[]): string[] =>
  steps.flatMap((step) => {
    if (step.kind === 'repeat') return targetsOf(step.steps);
    if (step.kind === 'rotate') return ['round', 'and round'];
    return step.kind === 'swing' ? [JSON.stringify(step.to)] : [];
  });

/** Whether a pass of it holds whole pairs: one that goes to a single side is a part of the pair that it stands in, and is never left out alone. */
const makesPairs = ({ steps }: RepeatStep): boolean => new Set(targetsOf(steps)).size > 1;

/** Whether the whole run would be over in time, by plan, if this pass were made and none after it. */
function finishesInTime({ plan, moment, again }: Passing): boolean {
  const { finishByUtcMs } = again;
  if (finishByUtcMs === undefined) return true;
  if (finishByUtcMs === 0) return false;
  let state = { ...moment, swingStartUtcMs: null as number | null };
  let cursor: CursorState = { ...again, executed: 0, finishByUtcMs: 0 };
  while (state.utcMs <= finishByUtcMs + roundingMs) {
    const next = advanceCursor(plan, cursor, state);
    if (next.item === null) return true;
    cursor = next.cursor;
    state = stateAfterIfPossible(next.item, plan, state);
  }
  return false;
}

/** Whether a pass of the repeat that began at the moment would end, by plan, no later than the deadline. */
function passEndsBy(deadlineUtcMs: number, { plan, moment, next: pass }: Passing): boolean {
  const passPlan: InnerPlan = { ...plan, protocol: { steps: [] }, within: pass };
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
