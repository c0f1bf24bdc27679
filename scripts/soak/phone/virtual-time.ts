import type { Cancel, Clock } from '@/server/interfaces/clock';
import { asOfThePhone } from './phone-time';

interface Due {
  atMs: number;
  task: () => void;
}

/** The phone's clock is this far off the server's, ms: a minute and a half fast, as a phone without network may be (an estimate, no source). */
export const phoneAheadMs = 90_000;

/** Time of both sides, which passes only when it is asked to; what is due at one instant happens in the order it was asked for. */
export class VirtualTime implements Clock {
  private due: Due[] = [];
  /** While it is frozen, nothing happens on the phone: what is due there comes when it wakes. */
  private frozenUntilMs = 0;

  constructor(private nowMs: number) {}

  monotonicMs = (): number => this.nowMs;
  utcMs = (): number => this.nowMs;

  after = (delayMs: number, task: () => void): Cancel => {
    const one = { atMs: this.nowMs + Math.max(0, delayMs), task };
    this.due.push(one);
    return () => {
      this.due = this.due.filter((other) => other !== one);
    };
  };

  /** The same on the phone, which may be frozen when it is due. */
  onPhone = (delayMs: number, task: () => void): Cancel => {
    let cancel: Cancel = () => undefined;
    const awake = () => {
      if (this.nowMs >= this.frozenUntilMs) task();
      else cancel = this.after(this.frozenUntilMs - this.nowMs, awake);
    };
    cancel = this.after(delayMs, awake);
    return () => cancel();
  };

  freeze(forMs: number): void {
    this.frozenUntilMs = this.nowMs + forMs;
  }

  get isFrozen(): boolean {
    return this.nowMs < this.frozenUntilMs;
  }

  /** Lets time pass; promises are through between any two things that are due. */
  async pass(ms: number): Promise<void> {
    const endMs = this.nowMs + ms;
    for (;;) {
      await settled();
      const next = this.due.reduce<Due | null>((best, one) => (best === null || one.atMs < best.atMs ? one : best), null);
      if (next === null || next.atMs > endMs) break;
      this.due = this.due.filter((one) => one !== next);
      this.nowMs = Math.max(this.nowMs, next.atMs);
      next.task();
    }
    this.nowMs = endMs;
  }

  /** The timers and the clock of the program are the phone's while `work` is done. */
  asOfThePhone<T>(work: () => Promise<T>): Promise<T> {
    return asOfThePhone({ utcMs: () => this.nowMs + phoneAheadMs, after: this.onPhone }, work);
  }
}

const turn = globalThis.setImmediate;
const settled = () => new Promise<void>((resolve) => void turn(resolve));
