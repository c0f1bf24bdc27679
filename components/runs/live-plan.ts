import { stepsOfLog, stepsOfPlan, type PlannedStep, type StripStep } from '@/components/charts/strip-model';
import type { RunState, RunView, StepRowView } from '@/shared/contracts/runs';
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
  return { steps: [...done, ...planned], items: [...done.map((step) => ({ ...step, path: step.key })), ...future] };
}

/** A dwell begun anew after a hold has the same path twice: the newest row counts. */
function futureOf(items: readonly PlannedStep[], last: StepRowView | null, lastStep: StripStep | null): PlannedStep[] {
  if (last === null || lastStep === null) return [...items];
  const at = items.findIndex((item) => item.path === last.path || last.path.startsWith(`${item.path}.`));
  if (at < 0) return [];
  const repeats = last.outcome === 'cut short';
  const next = repeats ? at : at + 1;
  const first = items[next];
  if (!first) return [];
  const shiftMs = lastStep.endUtcMs - first.startUtcMs;
  return items.slice(next).map((item) => ({ ...item, startUtcMs: item.startUtcMs + shiftMs, endUtcMs: item.endUtcMs + shiftMs }));
}
