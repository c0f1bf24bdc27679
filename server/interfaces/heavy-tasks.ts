import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import type { ChainedEvent, ChannelSeries, RunStart, SimulatedRun, StepRow } from '@/shared/archive/run-records';
import type { GBasis } from '@/shared/evaluation/g-basis';
import type { ClockChoice } from '@/shared/evaluation/clock-choice';
import type { EvaluationResult, FitCurve } from '@/shared/evaluation/result';
import type { ReportInput } from './report';

/** What a rehearsal leaves to be stored. */
export interface RehearsalRecords {
  outcome: 'finished' | 'held' | 'stopped' | 'failed';
  /** Why it did not finish; empty when it did. */
  reason: string;
  steps: StepRow[];
  events: ChainedEvent[];
  channels: ChannelSeries[];
  startedAtUtcMs: number | null;
  endedAtUtcMs: number;
}

/** What an evaluation leaves to be stored. */
export interface EvaluationWork {
  result: EvaluationResult;
  curves: FitCurve[];
  /** For values tried later; null without a G by equilibria. */
  basis: GBasis | null;
}

/** Work of seconds that must not hold up the loop which drives the rigs: done in worker threads. */
export interface HeavyTasks {
  rehearse(input: { start: RunStart & { simulated: SimulatedRun }; startUtcMs: number }): Promise<RehearsalRecords>;
  /** The archive of a run as a ZIP. */
  zipArchive(input: BuildArchiveInput): Promise<Uint8Array>;
  /** The measurement report of an evaluation as a PDF. */
  report(input: ReportInput): Promise<Uint8Array>;
  /**
   * Evaluates the archive that `zipArchive` would give.
   * @throws Error whose message says what makes the archive unusable
   */
  evaluate(input: BuildArchiveInput, options: { channel: string | null; clock: ClockChoice | null }): Promise<EvaluationWork>;
}
