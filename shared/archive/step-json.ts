import { formatInstant } from './instants';
import type { StepRow } from './run-records';
import type { addedStepColumns, stepColumns } from './step-csv';

type StepColumn = (typeof stepColumns)[number] | (typeof addedStepColumns)[number];

/** What the file says of the run whose steps it holds. */
export interface StepLogHead {
  run: string;
  protocol: string;
  rig: string;
}

/**
 * The step log as JSON: each row under the names of the CSV's columns, in their units (s, degrees; times in UTC to the microsecond),
 * `null` where the CSV has an empty cell, and texts as they were written: no apostrophe before what a spreadsheet would run.
 */
export function stepsJson(head: StepLogHead, rows: readonly StepRow[]): string {
  return `${JSON.stringify({ format: 'evenfall-steps', version: 1, ...head, steps: rows.map(stepObject) }, null, 2)}\n`;
}

function stepObject(row: StepRow): Record<StepColumn, string | number | boolean | null> {
  const time = (utcMs: number | null) => (utcMs === null ? null : formatInstant(utcMs));
  return {
    seq: row.seq,
    path: row.path,
    kind: row.kind,
    label: row.label,
    station: row.station === '' ? null : row.station,
    planned_start_utc: formatInstant(row.plannedStartUtcMs),
    planned_end_utc: time(row.plannedEndUtcMs),
    start_utc: formatInstant(row.startUtcMs),
    end_utc: time(row.endUtcMs),
    u_start_s: row.uStartS,
    u_end_s: row.uEndS,
    angle_start_deg: row.angleStartDeg,
    angle_end_deg: row.angleEndDeg,
    outcome: row.outcome,
    angle_source: row.angleSource,
    u_angle_deg: row.uAngleDeg,
    good: row.good,
  };
}
