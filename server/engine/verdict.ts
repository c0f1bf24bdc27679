import type { StepRow } from '@/shared/archive/run-records';
import type { Draft } from './draft';
import { noteDwellDone } from './pairs';

/** A dwell's row is closed: it is good unless the samples said otherwise, or its pair was broken; the log says why it is not. */
export function noteVerdict(draft: Draft, row: StepRow): void {
  const { context } = draft;
  const facts = context.dwells.findLast(({ seq }) => seq === row.seq);
  row.good = facts?.good ?? true;
  if (facts?.good === false)
    draft.log(
      'dwell-not-good',
      { seq: row.seq, path: row.path, why: facts.why },
      { utcMs: row.endUtcMs ?? draft.nowUtcMs, uS: row.uEndS ?? 0 },
    );
  if (row.outcome !== 'done') return;
  context.dwellsDone += 1;
  noteDwellDone(draft, row);
  if (row.good) context.dwellsGood += 1;
  context.dwellJustNotGood = !row.good;
  context.dwells = context.dwells.map((dwell) => (dwell.seq === row.seq ? { ...dwell, good: row.good === true } : dwell));
}
