import type { SimulatedBalance } from '@/shared/physics/simulated-balance';
import type { Cancel, Clock } from '../interfaces/clock';
import type { SampleBatch } from '../interfaces/sample-store';

export interface BalanceFeed {
  clock: Clock;
  balance: SimulatedBalance;
  /** True angle of the turntable, deg, at past instants and the present. */
  angleDegAt: (utcMs: number) => number;
  /** Takes each batch; the next one waits for it. */
  sink: (batch: SampleBatch) => void | Promise<void>;
  /** A batch that the sink refused; the samples of it are lost, the feed goes on. */
  onError: (error: unknown) => void;
}

/** Samples go out once a second. */
const BATCH_MS = 1000;

/** Lets the simulated balance run on the clock and gives its samples on. The result ends it. */
export function feedSimulatedBalance({ clock, balance, angleDegAt, sink, onError }: BalanceFeed): { stop(): void } {
  let stopped = false;
  let cancel: Cancel = () => undefined;

  async function giveOn(): Promise<void> {
    try {
      const batch = balance.advance({ toUtcMs: clock.utcMs(), angleDegAt });
      if (batch.utcMs.length > 0) await sink(batch);
    } catch (error) {
      onError(error);
    }
    if (!stopped) plan();
  }

  function plan(): void {
    cancel = clock.after(BATCH_MS, () => void giveOn());
  }

  plan();
  return {
    stop: () => {
      stopped = true;
      cancel();
    },
  };
}
