import type { RunJournal, RunJournals } from '../interfaces/run-journal';
import type { RunWrite } from '../interfaces/run-store';

/** A journal in memory, for runs in fast time: whoever holds the object holds what a disk would. */
export class MemoryJournal implements RunJournal {
  private writes: string[] = [];

  async append(write: RunWrite): Promise<void> {
    this.writes.push(JSON.stringify(write));
  }

  async read(): Promise<RunWrite[]> {
    return this.writes.map((text) => JSON.parse(text) as RunWrite);
  }

  async clear(): Promise<void> {
    this.writes = [];
  }

  async setAside(): Promise<string> {
    await this.clear();
    return 'nowhere';
  }
}

/** One for each run. */
export class MemoryJournals implements RunJournals {
  private readonly byRun = new Map<string, MemoryJournal>();

  of({ runId }: { runId: string }): MemoryJournal {
    const journal = this.byRun.get(runId) ?? new MemoryJournal();
    this.byRun.set(runId, journal);
    return journal;
  }
}
