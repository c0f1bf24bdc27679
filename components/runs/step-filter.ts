import type { StepRowView } from '@/shared/contracts/runs';

/** Filter of the step log. Pure. */
export interface StepFilter {
  kind: string;
  station: string;
  /** An outcome, `running`, or `not good`. */
  outcome: string;
}

export const everything = 'all';
export const noFilter: StepFilter = { kind: everything, station: everything, outcome: everything };

/** What the outcome column says: the outcome, or that the step goes on; a dwell that is not good says so. */
export function outcomeOf(row: Pick<StepRowView, 'outcome' | 'good'>): string {
  const outcome = row.outcome ?? 'running';
  return row.good === false ? `${outcome}, not good` : outcome;
}

const matchesOutcome = (row: StepRowView, wanted: string) =>
  wanted === everything || (wanted === 'not good' ? row.good === false : (row.outcome ?? 'running') === wanted);

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
    outcome: [...distinct(rows.map((row) => row.outcome ?? 'running')), ...(rows.some((row) => row.good === false) ? ['not good'] : [])],
  };
}
