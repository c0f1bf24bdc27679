import type { Draft } from './draft';
import { predictEndUtcMs } from './predicted-end';

const iso = (utcMs: number) => new Date(utcMs).toISOString();

export type ArmGiven = { name: string; untilUtcMs: number } | 'simulated' | null;

/** Why the arm does not let masses move until the predicted end of the run, in a sentence; null where it does. */
export function armRefusal(draft: Draft, arm: ArmGiven, armVoid: string | null): string | null {
  if (arm === 'simulated') return null;
  if (arm === null || armVoid !== null)
    return `The rig is not armed${armVoid === null ? '' : `: ${armVoid}`}. A named person has to arm it on site first.`;
  const endUtcMs = draft.predictedEndUtcMs ?? predictEndUtcMs(draft.start, draft.context, { nowUtcMs: draft.nowUtcMs });
  if (arm.untilUtcMs > endUtcMs) return null;
  return `The arm of ${arm.name} ends at ${iso(arm.untilUtcMs)}, before the predicted finish at ${iso(endUtcMs)}. Arm the rig until after that.`;
}
