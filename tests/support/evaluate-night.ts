import { buildArchive, type BuildArchiveInput } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive, type Evaluation } from '@/shared/evaluation/evaluate-archive';
import type { EvaluationOptions } from '@/shared/evaluation/registration';
import { sha256Hex } from '@/server/evaluation/sha256';
import { night, type NightPlan } from './night';

/** Evaluates records as the command does: written to an archive, verified, read back. */
export function evaluateRecords(input: BuildArchiveInput, options: EvaluationOptions = {}): Evaluation {
  return evaluateArchive(readArchive(buildArchive(input, sha256Hex), sha256Hex), options);
}

/** What was said of a night is what is said of it again: most tests ask one thing each of the same few nights. */
const known = new WeakMap<NightPlan, Evaluation>();

/** `change` stands between the night as it was and the records as they are evaluated. */
export function evaluateNight(
  plan: NightPlan,
  options?: EvaluationOptions,
  change?: (input: BuildArchiveInput) => BuildArchiveInput,
): Evaluation {
  const plain = options === undefined && change === undefined;
  const before = plain ? known.get(plan) : undefined;
  if (before !== undefined) return before;
  const records = night(plan);
  const evaluation = evaluateRecords(change === undefined ? records : change(records), options);
  if (plain) known.set(plan, evaluation);
  return evaluation;
}
