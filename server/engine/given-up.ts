import { appendEvent, type Sha256 } from '@/shared/archive/chain';
import type { LeftOpen, RunWrite, StoredRun } from '../interfaces/run-store';

export interface GivenUp {
  /** The person who looked at the rig. */
  by: string;
  /** Why nobody could carry the run on. */
  why: string;
  nowUtcMs: number;
  sha256: Sha256;
}

/**
 * The last write of a run that cannot be carried on: it ends as failed, its log says who ended it and why, and its open rows fail. When
 * their steps ended, and at which angle, nobody measured. The snapshot stays as it was.
 */
export function givenUp(stored: StoredRun, open: LeftOpen, { by, why, nowUtcMs, sha256 }: GivenUp): RunWrite {
  const { start, snapshot, chartVersion, chain } = stored;
  const event = appendEvent(
    chain,
    { at: new Date(nowUtcMs).toISOString(), kind: 'failed', data: { code: 'given-up', by, reason: why } },
    sha256,
  );
  return {
    ...{ labId: start.labId, runId: start.runId, expectedSeq: chain.seq, snapshot, chartVersion },
    steps: open.steps.map((step) => ({ ...step, endUtcMs: nowUtcMs, outcome: 'failed' })),
    events: [event],
    summary: {
      ...{ state: 'failed', outcome: 'failed', startedAtUtcMs: open.startedAtUtcMs, endedAtUtcMs: nowUtcMs, predictedEndUtcMs: null },
      failure: `${why} Ended by ${by}.`,
    },
  };
}
