import type { LiveChange } from '@/server/interfaces/process-post';

/** Changes of each run that are kept; older ones are in the database. */
const mostKept = 200;

/** The newest changes of each run that goes on, without a gap between them, for the pages that come back. */
export class RecentChanges {
  private readonly byRun = new Map<string, LiveChange[]>();

  add(runId: string, change: LiveChange): void {
    if (change.progress.endedAt !== null) {
      this.byRun.delete(runId);
      return;
    }
    const before = this.byRun.get(runId) ?? [];
    const last = before.at(-1)?.progress.lastSeq;
    this.byRun.set(runId, last === lastSeqBefore(change) ? [...before, change].slice(-mostKept) : [change]);
  }

  clear(): void {
    this.byRun.clear();
  }

  /** What came after an event up to another one; null where not all of it is kept. */
  between(runId: string, { afterSeq, lastSeq }: { afterSeq: number; lastSeq: number }): LiveChange[] | null {
    const kept = this.byRun.get(runId) ?? [];
    const [first] = kept;
    const last = kept.at(-1);
    if (first === undefined || last === undefined || lastSeqBefore(first) > afterSeq || last.progress.lastSeq < lastSeq) return null;
    return kept
      .filter(({ progress }) => progress.lastSeq >= afterSeq)
      .map((change) => ({ ...change, events: change.events.filter(({ seq }) => seq > afterSeq) }));
  }
}

const lastSeqBefore = ({ events, progress }: LiveChange) => progress.lastSeq - events.length;
