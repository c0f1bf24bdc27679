import type { Cancel, Clock } from '../interfaces/clock';
import type { RunJournal } from '../interfaces/run-journal';
import { type RunStore, type RunWrite, StaleRunError } from '../interfaces/run-store';
import { mergeWrites } from './merge-journal';

/** An outage of the database longer than this is an interruption of the run, ms. */
export const DATABASE_GRACE_MS = 4000;
/** A hold or a stop is kept on this computer's disk when the database has not taken it so soon, ms. */
const HURRIED_MS = 150;
const LONGEST_PAUSE_MS = 5000;

export interface SaverParts {
  store: RunStore;
  journal: RunJournal;
  clock: Clock;
  /** Called once for an outage that is longer than the grace; what is written from now on goes into the journal. */
  onAway(sinceUtcMs: number): void;
  /** The outage that `onAway` told of is over, and the database holds all that the journal kept. */
  onBack(): void;
  /** Another process has driven the run on, while this one wrote its journal. */
  onStale(error: StaleRunError): void;
  /** The database refuses what the journal kept, and will refuse it again: it stays in the journal. */
  onBroken(error: unknown): void;
  /** Whether what the database was asked may simply be asked again. */
  isPassing(error: unknown): boolean;
  /** What else went wrong with the journal. */
  onError(error: unknown): void;
}

interface Attempt {
  write: RunWrite;
  /** Resolves to whether the write is stored; false when it was left to the journal, or the saver was closed. */
  stored: Promise<boolean>;
  leftToJournal: boolean;
}

/**
 * Saves one write after the other. While the database is away they go into a journal on this computer's disk, and into the database when it
 * is back; where the journal takes none either, the write waits: nothing of a run is dropped.
 */
export class RunSaver {
  private sinceMs: number | null = null;
  private closed = false;
  private merging = false;
  private readonly backlog: RunWrite[] = [];
  private hurry: () => void = () => undefined;
  private cancelAway: Cancel | null = null;
  private away = false;

  constructor(private readonly parts: SaverParts) {}

  /** Since when the present write is being tried, monotonic ms; null when none is. */
  get busySinceMs(): number | null {
    return this.sinceMs;
  }

  /** What is written now goes into the journal. */
  get journalling(): boolean {
    return this.merging;
  }

  /** Stops trying: this process no longer drives the run. What the journal holds stays there for the next one. */
  close(): void {
    this.closed = true;
    this.cancelAway?.();
  }

  /** A hold or a stop waits behind the present write: the journal takes that one now, if the database does not. */
  hurryUp(): void {
    this.hurry();
  }

  /** The database does not answer, as somebody else has noticed, since `sinceUtcMs`. */
  noteAway(sinceUtcMs: number): void {
    if (this.closed || this.away) return;
    this.away = true;
    this.parts.onAway(sinceUtcMs);
  }

  /** Likewise: it answers again. Where writes are in the journal, its word counts that brings them in. */
  noteBack(): void {
    if (!this.merging && this.sinceMs === null) this.back();
  }

  /**
   * Saves in the database, or in the journal when the database does not take it within the grace (`hurried`: at once).
   * @returns whether the write is safe; false when the saver was closed meanwhile
   * @throws StaleRunError when another process has driven this run on, or has its rig
   * @throws what the database refuses the write with; the journal keeps the write then, for the next process
   */
  async save(write: RunWrite, { hurried = false } = {}): Promise<boolean> {
    // Whoever has let go of the run writes nothing more, not even into its journal.
    if (this.closed) return false;
    if (this.merging && (await this.keep(write))) return !this.closed;
    while (this.merging && !this.closed) await this.pause(HURRIED_MS);
    if (this.closed) return false;
    return this.saveDirectly(write, hurried);
  }

  private async saveDirectly(write: RunWrite, hurried: boolean): Promise<boolean> {
    const { clock } = this.parts;
    this.sinceMs = clock.monotonicMs();
    this.expectAnswer(clock.utcMs());
    const attempt: Attempt = { write, leftToJournal: false, stored: Promise.resolve(false) };
    attempt.stored = this.saveAtLast(attempt);
    try {
      const patience = this.patience(hurried);
      const inTime = await Promise.race([attempt.stored.then(() => true), patience.over]);
      patience.cancel();
      if (!inTime && (await this.handOver(attempt))) return !this.closed;
      const stored = await attempt.stored;
      this.back();
      return stored;
    } catch (error) {
      if (!this.closed && !(error instanceof StaleRunError)) await this.keep(write);
      throw error;
    } finally {
      this.sinceMs = null;
      this.hurry = () => undefined;
    }
  }

  /** From now on an outage counts. */
  private expectAnswer(sinceUtcMs: number): void {
    this.cancelAway ??= this.parts.clock.after(DATABASE_GRACE_MS, () => this.noteAway(sinceUtcMs));
  }

  private back(): void {
    this.cancelAway?.();
    this.cancelAway = null;
    if (!this.away || this.closed) return;
    this.away = false;
    this.parts.onBack();
  }

  private patience(hurried: boolean): { over: Promise<false>; cancel: Cancel } {
    const { clock } = this.parts;
    const timers: Cancel[] = [];
    const over = new Promise<false>((resolve) => {
      const after = (ms: number) => timers.push(clock.after(ms, () => resolve(false)));
      this.hurry = () => after(HURRIED_MS);
      after(hurried || this.away ? HURRIED_MS : DATABASE_GRACE_MS);
    });
    return { over, cancel: () => timers.forEach((cancel) => cancel()) };
  }

  /** The journal takes the write over. False when it does not, or when the run is no longer this process's. */
  private async handOver(attempt: Attempt): Promise<boolean> {
    if (this.closed || !(await this.keep(attempt.write))) return false;
    attempt.leftToJournal = true;
    attempt.stored.catch(() => undefined);
    this.merging = true;
    void this.merge();
    return true;
  }

  private async keep(write: RunWrite): Promise<boolean> {
    try {
      await this.parts.journal.append(write);
      this.backlog.push(write);
      return true;
    } catch (error) {
      this.parts.onError(error);
      return false;
    }
  }

  private async merge(): Promise<void> {
    for (let attempt = 0; !this.closed; attempt += 1) {
      try {
        const writes = [...this.backlog];
        if (writes.length > 0) await mergeWrites(this.parts.store, writes);
        this.backlog.splice(0, writes.length);
        if (this.backlog.length > 0) continue;
        await this.parts.journal.clear();
        if (this.backlog.length > 0) continue;
        this.merging = false;
        return this.back();
      } catch (error) {
        if (this.closed) return;
        if (error instanceof StaleRunError) return this.parts.onStale(error);
        if (!this.parts.isPassing(error)) return this.parts.onBroken(error);
        await this.pause(Math.min(100 * 2 ** attempt, LONGEST_PAUSE_MS));
      }
    }
  }

  private async saveAtLast(attempt: Attempt): Promise<boolean> {
    const { write } = attempt;
    for (let turn = 0; !this.closed && !attempt.leftToJournal; turn += 1) {
      try {
        await this.commit(write, turn > 0);
        return true;
      } catch (error) {
        if (error instanceof StaleRunError) throw error;
        if (this.closed) return false;
        if (!this.parts.isPassing(error)) throw error;
        await this.pause(Math.min(100 * 2 ** turn, LONGEST_PAUSE_MS));
      }
    }
    return false;
  }

  /** The answer to a commit may have been lost: then the chain already ends where the write ends. */
  private async commit(write: RunWrite, again: boolean): Promise<void> {
    try {
      await this.parts.store.commit(write);
    } catch (error) {
      if (!again || !(error instanceof StaleRunError) || !(await this.isStored(write))) throw error;
    }
  }

  private async isStored(write: RunWrite): Promise<boolean> {
    const stored = await this.parts.store.load(write.labId, write.runId);
    const last = write.events.at(-1);
    return stored !== null && last !== undefined && stored.chain.hash === last.hash;
  }

  private pause(delayMs: number): Promise<void> {
    return new Promise((resolve) => {
      const cancel: Cancel = this.parts.clock.after(delayMs, () => {
        cancel();
        resolve();
      });
    });
  }
}
