import type { LiveChange } from './live-hub';

/** Changes of each run that are kept; older ones are in the database. */
const mostKept = 200;

/** The newest changes of each run that goes on, without a gap between them, for the pages that come back. */
export class RecentChanges {
  private readonly byRun = new Map<string, LiveChange[]>();

  add(runId: string, change: LiveChange): void {
    if (change.view.endedAt !== null) {
      this.byRun.delete(runId);
      return;
    }
    const before = this.byRun.get(runId) ?? [];
    const last = before.at(-1)?.view.lastSeq;
    this.byRun.set(runId, last === lastSeqBefore(change) ? [...before, change].slice(-mostKept) : [change]);
  }

  /** What came after an event up to another one; null where not all of it is kept. */
  between(runId: string, { afterSeq, lastSeq }: { afterSeq: number; lastSeq: number }): LiveChange[] | null {
    const kept = this.byRun.get(runId) ?? [];
    const [first] = kept;
    const last = kept.at(-1);
    if (first === undefined || last === undefined || lastSeqBefore(first) > afterSeq || last.view.lastSeq < lastSeq) return null;
    return kept
      .filter(({ view }) => view.lastSeq >= afterSeq)
      .map((change) => ({ ...change, events: change.events.filter(({ seq }) => seq > afterSeq) }));
  }
}

const lastSeqBefore = ({ events, view }: LiveChange) => view.lastSeq - events.length;
