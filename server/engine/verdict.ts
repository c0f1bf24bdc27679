import type { StepRow } from '@/shared/archive/run-records';
import type { Draft } from './draft';

/** A dwell's row is closed: it is good unless the samples said otherwise, and the log says why it is not. */
export function noteVerdict(draft: Draft, row: StepRow): void {
  const { context } = draft;
  const facts = context.dwells.findLast(({ seq }) => seq === row.seq);
  row.good = facts?.good ?? true;
  if (row.outcome === 'done') {
    context.dwellsDone += 1;
    if (row.good) context.dwellsGood += 1;
    context.dwellJustNotGood = !row.good;
  }
  if (facts === undefined || facts.good) return;
  draft.log(
    'dwell-not-good',
    { seq: row.seq, path: row.path, why: facts.why },
    { utcMs: row.endUtcMs ?? draft.nowUtcMs, uS: row.uEndS ?? 0 },
  );
}
