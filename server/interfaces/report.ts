import type { StepRow } from '@/shared/archive/run-records';
import type { EvaluationResult, FitCurve } from '@/shared/evaluation/result';
import type { RigDocument } from '@/shared/rig/document';

/** All that a measurement report tells; no clock and no chance of its own, so that the same evaluation gives the same bytes. */
export interface ReportInput {
  run: {
    id: string;
    rigName: string;
    rigRevision: number;
    protocolName: string;
    protocolRevision: number;
    massSet: string;
    operator: string;
    rehearsal: boolean;
    startedAtUtcMs: number | null;
    endedAtUtcMs: number | null;
  };
  rig: RigDocument;
  evaluation: { id: string; at: string; by: string; channel: string | null; software: string | null };
  frozen: { at: string; by: string; reason: string } | null;
  result: EvaluationResult;
  curves: FitCurve[];
  steps: StepRow[];
  /** Stretches whose samples this evaluation did without, earliest first. */
  excluded: { startUtcMs: number; endUtcMs: number; by: string; reason: string }[];
  chainHead: string | null;
}
