import type { RunRecord } from '../store/runs-read';
import type { Services } from './services';

/** When a run began to count: at its first step, or when it was asked for where none was reached. */
export const startUtcMsOf = ({ startedAt, createdAt }: Pick<RunRecord, 'startedAt' | 'createdAt'>): number => startedAt ?? createdAt;

/** From the beginning of a run to its end; of one that goes on, until now. */
export const windowOf = (run: RunRecord, { clock }: Pick<Services, 'clock'>) => ({
  fromUtcMs: startUtcMsOf(run),
  toUtcMs: run.endedAt ?? clock.utcMs(),
});
