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

export function evaluateNight(plan: NightPlan, options: EvaluationOptions = {}): Evaluation {
  return evaluateRecords(night(plan), options);
}
