import type { StoredRun } from '../interfaces/run-store';
import type { Effect, RunSnapshot } from './run-context';

/** What the driver performs itself, after it was saved: all but the commands to the controller. */
export type OwnEffect = Exclude<Effect, { kind: 'link' }>;

/** Snapshot as stored, with what the next process has to know of this one. */
export interface StoredSnapshot extends RunSnapshot {
  /** Until when the process is known to have lived. */
  aliveUtcMs: number;
  /** Effects that were to be performed after this write; commands to the controller are not repeated, the run reconciles instead. */
  toPerform: OwnEffect[];
}

export const isOwn = (effect: Effect): effect is OwnEffect => effect.kind !== 'link';

export function snapshotIn(stored: StoredRun): RunSnapshot {
  const { version, state, context } = stored.snapshot as StoredSnapshot;
  return { version, state, context };
}
