import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { StandingEntry, StandingJournal } from '../interfaces/standing-journal';

interface Parts<E extends StandingEntry> {
  kind: E['kind'];
  /** In the words of the log. */
  what: string;
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  /** Brings an entry into the database; one that is there already changes nothing. */
  store(entry: E): Promise<void>;
}

const retryMs = 5_000;

/** What took effect at once, on this computer's disk until the database has it: tried until it is stored, by the next process too. */
export class UntilStored<E extends StandingEntry> {
  private keeping: Promise<unknown> = Promise.resolve();
  private closed = false;

  constructor(private readonly parts: Parts<E>) {}

  add(entry: E): void {
    const { standing, log, background, what } = this.parts;
    const kept = standing.keep(entry).catch((error: unknown) => log.error({ err: error }, `${what} is not safe on this disk`));
    this.keeping = Promise.all([this.keeping, kept]);
    background(this.untilStored(entry, kept), what);
  }

  /** Resolves when all that was added is on the disk, or cannot be. */
  async kept(): Promise<void> {
    await this.keeping;
  }

  /** Brings into the database what a process that is gone could not. */
  async settle(rigId: string): Promise<void> {
    for (const entry of await this.parts.standing.of(rigId)) {
      if (entry.kind !== this.parts.kind) continue;
      await this.parts.store(entry as E);
      await this.parts.standing.forget(entry);
    }
  }

  close(): void {
    this.closed = true;
  }

  private async untilStored(entry: E, kept: Promise<unknown>): Promise<void> {
    const { clock, log, what, store, standing } = this.parts;
    while (!this.closed) {
      try {
        await store(entry);
        await kept;
        return await standing.forget(entry);
      } catch (error) {
        log.warn({ err: error }, `${what} is not stored yet`);
        await new Promise<void>((resolve) => void clock.after(retryMs, resolve));
      }
    }
  }
}
