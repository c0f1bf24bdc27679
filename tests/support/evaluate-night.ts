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

/** `change` stands between the night as it was and the records as they are evaluated. */
export function evaluateNight(
  plan: NightPlan,
  options: EvaluationOptions = {},
  change: (input: BuildArchiveInput) => BuildArchiveInput = (input) => input,
): Evaluation {
  return evaluateRecords(change(night(plan)), options);
}
