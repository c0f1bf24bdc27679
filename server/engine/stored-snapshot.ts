import type { StoredRun } from '../interfaces/run-store';
import { CHART_VERSION, type Effect, type RunContext, type RunSnapshot } from './run-context';
import { noPair } from './pairs';
import { nothingKnown } from './position';

/** What the driver performs itself, after it was saved: all but the commands to the controller and looks into the samples. */
export type OwnEffect = Exclude<Effect, { kind: 'link' | 'look' }>;

/** Snapshot as stored, with what the next process has to know of this one. */
export interface StoredSnapshot extends RunSnapshot {
  /** Until when the process is known to have lived. */
  aliveUtcMs: number;
  /** Effects that were to be performed after this write; commands to the controller are not repeated, the run reconciles instead. */
  toPerform: OwnEffect[];
}

export const isOwn = (effect: Effect): effect is OwnEffect => effect.kind !== 'link' && effect.kind !== 'look';

/**
 * Contexts of version 1 tell nothing of passes of the home edge: the count is unproved until the next one. Those of version 2 were never
 * written while the database was away. Those of version 3 do not tell which dwells make a pair: the next one begins one. Before version 5 no
 * dwell was judged and nothing was waited for. Before version 6 it was not looked whether the pendulum answers a swing, and silence held no run.
 * Before version 7 there were neither shaped swings nor kicks: no step is made of parts.
 */
type Newer =
  | 'swungFromDeg'
  | 'heldForDwell'
  | 'position'
  | 'databaseAwaySinceUtcMs'
  | 'pair'
  | 'dwellsGood'
  | 'dwells'
  | 'judging'
  | 'dwellJustNotGood'
  | 'waiting';
type OldContext = Omit<RunContext, Newer> & Partial<Pick<RunContext, Newer>>;

const unjudged = { silent: false, noResponse: null, excursion: null, loud: null };

/** A snapshot of this or an older version in the shape of this one; null where this version cannot read it. */
export function restored(snapshot: unknown, chartVersion: number): RunSnapshot | null {
  if (snapshot === null || chartVersion < 1 || chartVersion > CHART_VERSION) return null;
  const { state, context } = snapshot as Omit<RunSnapshot, 'context'> & { context: OldContext };
  const newer = {
    ...{ position: nothingKnown, databaseAwaySinceUtcMs: null, pair: noPair, dwellsGood: context.dwellsDone },
    ...{ judging: null, dwellJustNotGood: false, waiting: null, swungFromDeg: null, heldForDwell: null },
  };
  const dwells = (context.dwells ?? []).map((dwell) => ({ ...unjudged, ...dwell }));
  return { version: CHART_VERSION, state, context: { ...newer, ...context, dwells } };
}

/** @throws Error when the store holds a snapshot of another version: the supervisor quarantines such runs before. */
export function snapshotIn({ snapshot, chartVersion }: StoredRun): RunSnapshot {
  const found = restored(snapshot, chartVersion);
  if (found === null) throw new Error(`a snapshot of version ${chartVersion} cannot be taken up`);
  return found;
}
