import { type ChainHead, emptyChain } from '@/shared/archive/chain';
import type { ChainedEvent, RunStart, StepRow } from '@/shared/archive/run-records';
import { type LeftOpen, type RunStore, type RunWrite, StaleRunError, type StoredRun } from '../../interfaces/run-store';

/** Keeps one run in memory: what a rehearsal leaves. */
export class RehearsalStore implements RunStore {
  readonly events: ChainedEvent[] = [];
  private readonly rows = new Map<number, StepRow>();
  private snapshot: unknown = null;
  private chartVersion = 0;

  constructor(private readonly start: RunStart) {}

  async load(): Promise<StoredRun | null> {
    return { start: this.start, snapshot: this.snapshot, chartVersion: this.chartVersion, chain: this.head() };
  }

  async unfinished(): Promise<StoredRun[]> {
    const run = await this.load();
    return run === null ? [] : [run];
  }

  async leftOpen(): Promise<LeftOpen> {
    return { startedAtUtcMs: null, steps: this.steps().filter(({ outcome }) => outcome === null) };
  }

  async commit(write: RunWrite): Promise<void> {
    if (write.expectedSeq !== this.head().seq) throw new StaleRunError(`the chain ends at ${this.head().seq}, not at ${write.expectedSeq}`);
    this.events.push(...write.events);
    for (const row of write.steps) this.rows.set(row.seq, row);
    this.snapshot = write.snapshot;
    this.chartVersion = write.chartVersion;
  }

  steps(): StepRow[] {
    return [...this.rows.values()].sort((a, b) => a.seq - b.seq);
  }

  private head(): ChainHead {
    return this.events.at(-1) ?? emptyChain;
  }
}
