import type { RigDocument } from '../rig/document';
import type { RepeatStep, Step } from './document';
import { leastPasses } from './cursor';
import { homeDurationS, swingMove, UnplayableStep } from './durations';
import { partsDurationS, partsIfPossible } from './step-parts';
import { waitOf } from './wait';

export interface LeastPlan {
  durationS: number;
  /** Where the sources stand afterwards, deg; null: not known. */
  angleDeg: number | null;
}

/**
 * The least time that steps take, s, from a turntable angle in deg (null: not known). A first move from an unknown angle counts as none, a
 * beat as what its swing leaves of it, a repeat until a time as no pass, and what ends by a condition as long as the samples it needs.
 */
export function leastPlan(steps: readonly Step[], rig: RigDocument, angleDeg: number | null): LeastPlan {
  let plan: LeastPlan = { durationS: 0, angleDeg };
  let swingS = 0;
  for (const step of steps) {
    const after = afterStep(step, rig, { angleDeg: plan.angleDeg, swingS });
    swingS = step.kind === 'swing' ? after.durationS : 0;
    plan = { durationS: plan.durationS + after.durationS, angleDeg: after.angleDeg };
  }
  return plan;
}

interface Before {
  angleDeg: number | null;
  /** Length of the swing just before, s. */
  swingS: number;
}

function afterStep(step: Step, rig: RigDocument, { angleDeg, swingS }: Before): LeastPlan {
  const periodS = rig.measured?.period_s?.value ?? 0;
  switch (step.kind) {
    case 'home':
      return rig.motion === undefined
        ? { durationS: 0, angleDeg: null }
        : { durationS: homeDurationS(rig, angleDeg ?? rig.motion.homeDeg), angleDeg: rig.motion.homeDeg };
    case 'swing':
      return afterSwing(step, rig, angleDeg);
    case 'kick':
    case 'rotate':
      return { durationS: partsDurationS((angleDeg === null ? null : partsIfPossible(step, rig, angleDeg)) ?? []), angleDeg };
    case 'dwell':
      if (step.beat_periods !== undefined) return { durationS: Math.max(0, step.beat_periods * periodS - swingS), angleDeg };
      return { durationS: step.for_s ?? (step.periods ?? 0) * periodS, angleDeg };
    case 'settle':
      return { durationS: step.for_s ?? waitOf(step)?.windowS ?? 0, angleDeg };
    case 'wait':
      return { durationS: waitOf(step)?.windowS ?? 0, angleDeg };
    case 'repeat':
      return afterRepeat(step, rig, angleDeg);
    default:
      return { durationS: 0, angleDeg };
  }
}

function afterSwing(step: Extract<Step, { kind: 'swing' }>, rig: RigDocument, angleDeg: number | null): LeastPlan {
  try {
    const { durationS, targetDeg } = swingMove(step, rig, angleDeg ?? 0);
    if (angleDeg === null) return { durationS: 0, angleDeg: targetDeg };
    const parts = partsIfPossible(step, rig, angleDeg);
    return { durationS: parts === null ? durationS : partsDurationS(parts), angleDeg: targetDeg };
  } catch (error) {
    if (error instanceof UnplayableStep) return { durationS: 0, angleDeg: null };
    throw error;
  }
}

/** Angles are absolute, so every pass after the first begins as the second does. */
function afterRepeat(repeat: RepeatStep, rig: RigDocument, angleDeg: number | null): LeastPlan {
  const { until, atMost, steps } = repeat;
  const times = until !== undefined && 'relativeStatisticalU' in until ? leastPasses(repeat) : repeat.times;
  if (times === undefined) return { durationS: 0, angleDeg: leastPlan(steps, rig, angleDeg).angleDeg === angleDeg ? angleDeg : null };
  const passes = Math.min(times, atMost ?? times);
  const first = leastPlan(steps, rig, angleDeg);
  const later = leastPlan(steps, rig, first.angleDeg);
  return { durationS: first.durationS + (passes - 1) * later.durationS, angleDeg: later.angleDeg };
}
