import type { StepRowView } from '@/shared/contracts/runs';

export interface Pair {
  /** Sequence numbers of its two dwells. */
  seqs: [number, number];
  /** Both dwells are good and whole. */
  counts: boolean;
}

const sides = ['near', 'far'];

/** The pairs of a run: each near dwell with the far dwell next to it, every dwell in one pair at most. */
export function pairsOf(rows: readonly StepRowView[]): Pair[] {
  const dwells = rows.filter((row) => row.kind === 'dwell' && row.outcome !== null && sides.includes(row.station));
  const pairs: Pair[] = [];
  let open: StepRowView | null = null;
  for (const row of dwells) {
    if (open === null || open.station === row.station) {
      open = row;
      continue;
    }
    pairs.push({ seqs: [open.seq, row.seq], counts: counts(open) && counts(row) });
    open = null;
  }
  return pairs;
}

const counts = (row: StepRowView): boolean => row.good !== false && row.outcome === 'done';
