import type { RigDocument } from '../rig/document';
import { advanceCursor, beginCursor, greatestStepCount, type PlannedItem, type CursorPlan } from './cursor';
import type { StepKind } from './document';
import { stationAt } from './stations';
import { type PlanState, stateAfterIfPossible, stationAfter } from './step-effect';

export interface TimelineItem {
  path: string;
  documentPath: string;
  kind: Exclude<StepKind, 'repeat'> | 'ring-down';
  /** Of a shaped swing or a kick: which part this is. */
  part?: 'move' | 'pause' | 'ring-down';
  label: string;
  /** Station at which the sources stand when the step ends; empty at an angle that is no station. */
  station: string;
  startUtcMs: number;
  endUtcMs: number;
  angleFromDeg: number;
  angleToDeg: number;
  /** For swings and the moves of a kick: deg/s and deg/s2. */
  speedDegS?: number;
  accelerationDegS2?: number;
}

export interface Timeline {
  items: TimelineItem[];
  startUtcMs: number;
  endUtcMs: number;
  durationS: number;
  /** Number of dwells. */
  dwells: number;
  /** The plan was cut off because it goes beyond 10,000 steps or turns without an end. */
  truncated: boolean;
}

/**
 * The protocol as it would run if all goes by plan, from a start in UTC ms at a turntable angle in deg. Made for drafts too: a step that
 * cannot be carried out takes no time, and a plan without an end is cut off.
 */
export function planTimeline(plan: CursorPlan, start: { utcMs: number; angleDeg: number }): Timeline {
  const items: TimelineItem[] = [];
  let state: PlanState = { ...start, swingStartUtcMs: null };
  let station = stationAt(plan.rig, start.angleDeg);
  let cursor = beginCursor();
  for (;;) {
    const next = tryAdvance(plan, cursor, state);
    if (next === 'endless') return finish(items, start.utcMs, true);
    if (next.item === null) return finish(items, start.utcMs, false);
    cursor = next.cursor;
    const after = stateAfterIfPossible(next.item, plan, state);
    station = stationAfter(next.item, plan.rig, { angleDeg: after.angleDeg, angleBeforeDeg: state.angleDeg, stationBefore: station });
    items.push(timelineItem(next.item, plan.rig, { before: state, after, station }));
    state = after;
    if (items.length > greatestStepCount) return finish(items, start.utcMs, true);
  }
}

function tryAdvance(
  plan: CursorPlan,
  cursor: ReturnType<typeof beginCursor>,
  state: PlanState,
): ReturnType<typeof advanceCursor> | 'endless' {
  try {
    return advanceCursor(plan, cursor, state);
  } catch (error) {
    if (error instanceof RangeError) return 'endless';
    throw error;
  }
}

function timelineItem(
  { path, documentPath, step, part }: PlannedItem,
  rig: RigDocument,
  at: { before: PlanState; after: PlanState; station: string },
): TimelineItem {
  const item: TimelineItem = {
    // A pause has no row in the log, and no name of its own there.
    path: part?.kind === 'pause' ? `${path} pause ${part.offsetS}` : path,
    documentPath,
    kind: part?.kind === 'ring-down' ? 'ring-down' : step.kind,
    ...(part === undefined ? {} : { part: part.kind }),
    label: step.label ?? '',
    station: at.station,
    startUtcMs: at.before.utcMs,
    endUtcMs: at.after.utcMs,
    angleFromDeg: at.before.angleDeg,
    angleToDeg: at.after.angleDeg,
  };
  if (part?.kind === 'move') return { ...item, speedDegS: part.speedDegS, accelerationDegS2: part.accelerationDegS2 };
  if (part !== undefined || step.kind !== 'swing' || rig.motion === undefined) return item;
  return {
    ...item,
    speedDegS: step.speed_deg_s ?? rig.motion.maxSpeed_deg_s,
    accelerationDegS2: step.acceleration_deg_s2 ?? rig.motion.maxAcceleration_deg_s2,
  };
}

function finish(items: TimelineItem[], startUtcMs: number, truncated: boolean): Timeline {
  const endUtcMs = items.at(-1)?.endUtcMs ?? startUtcMs;
  return {
    items,
    startUtcMs,
    endUtcMs,
    durationS: (endUtcMs - startUtcMs) / 1000,
    dwells: items.filter(({ kind }) => kind === 'dwell').length,
    truncated,
  };
}
