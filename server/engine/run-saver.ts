import type { Cancel, Clock } from '../interfaces/clock';
import { type RunStore, type RunWrite, StaleRunError } from '../interfaces/run-store';

/** An outage of the database longer than this is an interruption of the run, ms. */
export const DATABASE_GRACE_MS = 4000;
const LONGEST_PAUSE_MS = 5000;

export interface SaverParts {
  store: RunStore;
  clock: Clock;
  /** Called once for a write that is not through after the grace; the write goes on being tried. */
  onAway(sinceUtcMs: number): void;
}

/** Saves one write after the other, trying until it is through: nothing of a run is dropped because the database is away. */
export class RunSaver {
  private sinceMs: number | null = null;
  private closed = false;

  constructor(private readonly parts: SaverParts) {}

  /** Since when the present write is being tried, monotonic ms; null when none is. */
  get busySinceMs(): number | null {
    return this.sinceMs;
  }

  /** Stops trying: this process no longer drives the run. */
  close(): void {
    this.closed = true;
  }

  /**
   * @returns whether the write is stored; false when the saver was closed meanwhile
   * @throws StaleRunError when another process has driven this run on
   */
  async save(write: RunWrite): Promise<boolean> {
    const { clock, onAway } = this.parts;
    this.sinceMs = clock.monotonicMs();
    const sinceUtcMs = clock.utcMs();
    const cancel = clock.after(DATABASE_GRACE_MS, () => onAway(sinceUtcMs));
    try {
      return await this.saveAtLast(write);
    } finally {
      cancel();
      this.sinceMs = null;
    }
  }

  private async saveAtLast(write: RunWrite): Promise<boolean> {
    for (let attempt = 0; !this.closed; attempt += 1) {
      try {
        await this.parts.store.commit(write);
        return true;
      } catch (error) {
        if (error instanceof StaleRunError) {
          if (attempt > 0 && (await this.isStored(write))) return true;
          throw error;
        }
        await this.pause(Math.min(100 * 2 ** attempt, LONGEST_PAUSE_MS));
      }
    }
    return false;
  }

  /** A commit may have gone through although its answer was lost: then the chain already ends where the write ends. */
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
