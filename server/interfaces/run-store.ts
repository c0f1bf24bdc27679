import type { RunStart, StepRow, ChainedEvent } from '@/shared/archive/run-records';

/** Where runs are kept. One `commit` is one transaction: all of it or nothing. */
export interface RunStore {
  load(labId: string, runId: string): Promise<StoredRun | null>;
  /** What a run that nobody can carry on left open: its rows without an outcome, and when it had started. */
  leftOpen(labId: string, runId: string): Promise<LeftOpen>;
  /** Runs that have not ended, of the rigs this process drives. */
  unfinished(): Promise<StoredRun[]>;
  /**
   * @throws StaleRunError when the chain ends elsewhere than the writer believes
   * @throws RigLostError when another process has the rig
   */
  commit(write: RunWrite): Promise<void>;
}

export interface StoredRun {
  start: RunStart;
  /** The engine's own state, opaque to the store; carries the version of the chart. */
  snapshot: unknown;
  chartVersion: number;
  /** Last sequence number and hash of the event chain. */
  chain: { seq: number; hash: string };
}

export interface LeftOpen {
  startedAtUtcMs: number | null;
  steps: StepRow[];
}

export interface RunWrite {
  labId: string;
  runId: string;
  /** The chain's last seq as the writer knows it; a store that holds another refuses with `StaleRunError`. */
  expectedSeq: number;
  snapshot: unknown;
  chartVersion: number;
  /** Inserted, or replacing the row with the same seq. */
  steps: StepRow[];
  events: ChainedEvent[];
  /** Columns that lists and screens read without opening the snapshot. */
  summary: RunSummaryColumns;
}

export interface RunSummaryColumns {
  state: string;
  outcome: 'finished' | 'held' | 'stopped' | 'failed' | null;
  startedAtUtcMs: number | null;
  endedAtUtcMs: number | null;
  predictedEndUtcMs: number | null;
  /** Why it failed, where no snapshot says so. */
  failure?: string;
}

export class StaleRunError extends Error {
  readonly code = 'stale-run';
}

/** The lease of the run's rig is another process's: wherever the chain ends, this process writes nothing into it. */
export class RigLostError extends StaleRunError {}
