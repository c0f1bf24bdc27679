import type { Cancel, Clock } from '@/server/interfaces/clock';

/** Does something again and again, `everyMs` apart, for as long as it answers true. */
export class Repeated {
  private cancel: Cancel | null = null;
  private ended = false;

  constructor(
    private readonly clock: Clock,
    private readonly everyMs: number,
    private readonly turn: () => boolean,
  ) {}

  /** Begins, unless it goes on already. */
  keep(): void {
    if (this.cancel !== null || this.ended) return;
    this.cancel = this.clock.after(this.everyMs, () => {
      this.cancel = null;
      if (this.turn()) this.keep();
    });
  }

  end(): void {
    this.ended = true;
    this.cancel?.();
  }
}
