import { type ChainHead, emptyChain } from '@/shared/archive/chain';
import type { ChainedEvent, RunStart, StepRow } from '@/shared/archive/run-records';
import { type LeftOpen, type RunStore, type RunWrite, StaleRunError, type StoredRun } from '@/server/interfaces/run-store';

export const databaseAway = () => Object.assign(new Error('the connection broke before the answer'), { code: 'ECONNRESET' });

/** A database in memory: what is not plain data is lost in it, and it can be away. */
export class SimulatedStore implements RunStore {
  readonly events: ChainedEvent[] = [];
  readonly rows = new Map<number, StepRow>();
  away = false;
  /** Asked at each commit; `answer-lost`: stored, and the answer never comes. */
  onCommit: (when: 'before' | 'after') => void = () => undefined;
  loseAnswers = 0;
  private stored: string | null = null;

  constructor(public start: RunStart) {}

  async load(): Promise<StoredRun | null> {
    if (this.away) throw databaseAway();
    const kept = this.stored === null ? { snapshot: null, chartVersion: 0 } : (JSON.parse(this.stored) as object);
    return { start: this.start, ...(kept as { snapshot: unknown; chartVersion: number }), chain: this.head() };
  }

  async unfinished(): Promise<StoredRun[]> {
    const run = await this.load();
    return run === null || this.stored === null ? [] : [run];
  }

  async leftOpen(): Promise<LeftOpen> {
    return { startedAtUtcMs: null, steps: [...this.rows.values()].filter(({ outcome }) => outcome === null) };
  }

  /** What else is stored in one transaction. */
  async write<T>(deed: () => T): Promise<T> {
    this.onCommit('before');
    if (this.away) throw databaseAway();
    const done = deed();
    this.answers();
    return done;
  }

  async commit(write: RunWrite): Promise<void> {
    this.onCommit('before');
    if (this.away) throw databaseAway();
    if (this.head().seq !== write.expectedSeq) throw new StaleRunError(`the chain ends at ${this.head().seq}`);
    const { events, steps } = JSON.parse(JSON.stringify({ events: write.events, steps: write.steps })) as RunWrite;
    this.events.push(...events);
    for (const row of steps) this.rows.set(row.seq, row);
    this.stored = JSON.stringify({ snapshot: write.snapshot, chartVersion: write.chartVersion });
    this.answers();
  }

  /** Of the run, as stored. */
  state(): string | null {
    return this.stored === null ? null : (JSON.parse(this.stored) as { snapshot: { state: string } }).snapshot.state;
  }

  private answers(): void {
    this.onCommit('after');
    if (this.loseAnswers === 0) return;
    this.loseAnswers -= 1;
    throw databaseAway();
  }

  private head(): ChainHead {
    return this.events.at(-1) ?? emptyChain;
  }
}
