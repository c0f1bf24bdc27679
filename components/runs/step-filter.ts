import type { StepRowView } from '@/shared/contracts/runs';

/** Filter of the step log. Pure. */
export interface StepFilter {
  kind: string;
  station: string;
  /** An outcome, `running`, `not good`, or `not proved`. */
  outcome: string;
}

export const everything = 'all';
export const noFilter: StepFilter = { kind: everything, station: everything, outcome: everything };

/** What the outcome column says: the outcome, or that the step goes on; a dwell that is not good says so. */
export function outcomeOf(row: Pick<StepRowView, 'outcome' | 'good'>): string {
  const outcome = row.outcome ?? 'running';
  return row.good === false ? `${outcome}, not good` : outcome;
}

/** A dwell whose angle was only counted: no pass of the home edge proves it. */
export const isUnproved = (row: Pick<StepRowView, 'kind' | 'angleSource'>): boolean =>
  row.kind === 'dwell' && row.angleSource === 'counted';

function matchesOutcome(row: StepRowView, wanted: string): boolean {
  if (wanted === everything) return true;
  if (wanted === 'not good') return row.good === false;
  return wanted === 'not proved' ? isUnproved(row) : (row.outcome ?? 'running') === wanted;
}

export function filterSteps(rows: readonly StepRowView[], filter: StepFilter): StepRowView[] {
  return rows.filter(
    (row) =>
      (filter.kind === everything || row.kind === filter.kind) &&
      (filter.station === everything || row.station === filter.station) &&
      matchesOutcome(row, filter.outcome),
  );
}

const distinct = (values: readonly string[]) => [...new Set(values)].filter((value) => value !== '').sort();

/** The choices that the rows offer; only those that occur. */
export function filterChoices(rows: readonly StepRowView[]): Record<keyof StepFilter, string[]> {
  return {
    kind: distinct(rows.map((row) => row.kind)),
    station: distinct(rows.map((row) => row.station)),
    outcome: [
      ...distinct(rows.map((row) => row.outcome ?? 'running')),
      ...(rows.some((row) => row.good === false) ? ['not good'] : []),
      ...(rows.some(isUnproved) ? ['not proved'] : []),
    ],
  };
}
