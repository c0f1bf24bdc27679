import { stepsOfLog, stepsOfPlan, type PlannedStep, type StripStep } from '@/components/charts/strip-model';
import type { RunState, RunView, StepRowView } from '@/shared/contracts/runs';
import { trapezoid } from '@/shared/physics/trapezoid';
import { planTimeline } from '@/shared/protocol/timeline';

/** The rest of the night as it stands now: the plan from the step that is going on, moved to where that step really ends. Pure. */

/** The whole protocol as planned from its start; null where it cannot be planned (not started, or steps of a later version). */
export function plannedItems(
  view: Pick<RunView, 'protocol' | 'rig' | 'startedAt' | 'shuffleSeed'>,
  timeZone: string,
): readonly PlannedStep[] | null {
  const { protocol, rig, shuffleSeed } = view;
  if (view.startedAt === null) return null;
  try {
    return planTimeline(
      { protocol, rig, timeZone, ...(shuffleSeed === undefined ? {} : { shuffleSeed }) },
      { utcMs: Date.parse(view.startedAt), angleDeg: rig.motion?.homeDeg ?? 0 },
    ).items;
  } catch {
    return null;
  }
}

const over: ReadonlySet<RunState> = new Set(['finished', 'stopped', 'failed']);

export interface NightPlan {
  /** What was done, is being done and is to come. */
  steps: StripStep[];
  /** The same as planned steps, for a prediction of the deflection. */
  items: PlannedStep[];
}

/** Rows of the log, then what is left of the plan. A run that has ended has no future. */
export function nightPlan(state: RunState, rows: readonly StepRowView[], items: readonly PlannedStep[] | null): NightPlan {
  const done = stepsOfLog(rows);
  const last = rows.at(-1);
  const future = items === null || over.has(state) ? [] : futureOf(items, last ?? null, done.at(-1) ?? null);
  const planned = stepsOfPlan(future);
  const past = done.map((step, index) => ({ ...step, ...motionOf(step, rows[index]?.path, items), path: step.key }));
  return { steps: [...done, ...planned], items: [...past, ...future] };
}

/** Where the move that is going on leads to, which its row does not tell yet. */
function motionOf(step: StripStep, path: string | undefined, items: readonly PlannedStep[] | null): Partial<PlannedStep> {
  const planned = step.phase === 'running' ? items?.find((item) => item.path === path) : undefined;
  if (planned === undefined) return {};
  const { angleToDeg, speedDegS, accelerationDegS2 } = planned;
  return { angleToDeg, ...(speedDegS === undefined || accelerationDegS2 === undefined ? {} : { speedDegS, accelerationDegS2 }) };
}

/** A step that was cut short, as it is done again: of a move only the rest. */
function restOf(item: PlannedStep, fromDeg: number): PlannedStep {
  const { angleFromDeg, angleToDeg, speedDegS, accelerationDegS2, startUtcMs } = item;
  if (angleFromDeg === angleToDeg || speedDegS === undefined || accelerationDegS2 === undefined) return item;
  const { durationS } = trapezoid({ fromDeg, toDeg: angleToDeg, speedDegS, accelerationDegS2 });
  return { ...item, angleFromDeg: fromDeg, endUtcMs: startUtcMs + 1000 * durationS };
}

/** A dwell begun anew after a hold has the same path twice: the newest row counts. */
function futureOf(items: readonly PlannedStep[], last: StepRowView | null, lastStep: StripStep | null): PlannedStep[] {
  if (last === null || lastStep === null) return [...items];
  const at = items.findIndex((item) => item.path === last.path || last.path.startsWith(`${item.path}.`));
  if (at < 0) return [];
  const repeats = last.outcome === 'cut short';
  const next = repeats ? at : at + 1;
  const planned = items[next];
  if (!planned) return [];
  const first = repeats ? restOf(planned, lastStep.angleToDeg) : planned;
  const shifted = (item: PlannedStep, byMs: number) => ({ ...item, startUtcMs: item.startUtcMs + byMs, endUtcMs: item.endUtcMs + byMs });
  const shiftMs = lastStep.endUtcMs - first.startUtcMs;
  const savedMs = planned.endUtcMs - first.endUtcMs;
  return [shifted(first, shiftMs), ...items.slice(next + 1).map((item) => shifted(item, shiftMs - savedMs))];
}
