import { csvLine, numberOfCell, readCsv, textCell, textOfCell, type CsvRow } from './csv-text';
import { formatInstant, parseInstant } from './instants';
import type { StepOutcome, StepRow, StepRowKind } from './run-records';
import { UnusableArchive } from './unusable-archive';

export const stepsFile = 'steps.csv';

/** The columns of the format, in order; the last three are added by Evenfall and may be absent when read. */
export const stepColumns = [
  'seq',
  'path',
  'kind',
  'label',
  'station',
  'planned_start_utc',
  'planned_end_utc',
  'start_utc',
  'end_utc',
  'u_start_s',
  'u_end_s',
  'angle_start_deg',
  'angle_end_deg',
  'outcome',
] as const;
export const addedStepColumns = ['angle_source', 'u_angle_deg', 'good'] as const;

const kinds: readonly StepRowKind[] = [
  'home',
  'swing',
  'dwell',
  'kick',
  'ring-down',
  'settle',
  'wait',
  'proof',
  'mark',
  'prompt',
  'rotate',
];
const outcomes: readonly StepOutcome[] = ['done', 'cut short', 'skipped', 'failed', 'late'];
const angleSources = ['counted', 'edge-verified', 'encoder'] as const;

/** The step log as CSV, with a header. */
export function stepsCsv(rows: readonly StepRow[]): string {
  const time = (utcMs: number | null) => (utcMs === null ? '' : formatInstant(utcMs));
  const number = (value: number | null) => (value === null ? '' : String(value));
  const lines = rows.map((row) =>
    csvLine([
      String(row.seq),
      textCell(row.path),
      row.kind,
      textCell(row.label),
      textCell(row.station),
      time(row.plannedStartUtcMs),
      time(row.plannedEndUtcMs),
      time(row.startUtcMs),
      time(row.endUtcMs),
      number(row.uStartS),
      number(row.uEndS),
      number(row.angleStartDeg),
      number(row.angleEndDeg),
      row.outcome ?? '',
      row.angleSource,
      number(row.uAngleDeg),
      row.good === null ? '' : String(row.good),
    ]),
  );
  return csvLine([...stepColumns, ...addedStepColumns]) + lines.join('');
}

/**
 * Reads a step log.
 * @throws UnusableArchive naming the row and the column of the first cell that cannot be what it is.
 */
export function readSteps(text: string): StepRow[] {
  let lastSeq = -Infinity;
  return readCsv(stepsFile, text, stepColumns).map((line) => {
    const row = stepOf(line);
    if (row.seq <= lastSeq) refuse(line, 'seq', `${row.seq} does not come after ${lastSeq}: seq must grow from row to row`);
    lastSeq = row.seq;
    return row;
  });
}

function stepOf(line: CsvRow): StepRow {
  const startUtcMs = instant(line, 'start_utc');
  if (startUtcMs === null) refuse(line, 'start_utc', 'a time is needed here');
  const endUtcMs = instant(line, 'end_utc');
  if (endUtcMs !== null && endUtcMs < startUtcMs) refuse(line, 'end_utc', 'the step ends before it starts');
  const good = line.cell('good');
  if (good !== '' && good !== 'true' && good !== 'false') refuse(line, 'good', `"${good}" must be true, false or empty`);
  return {
    seq: integer(line, 'seq'),
    path: textOfCell(line.cell('path')),
    kind: oneOf(line, 'kind', kinds),
    label: textOfCell(line.cell('label')),
    station: textOfCell(line.cell('station')),
    plannedStartUtcMs: instant(line, 'planned_start_utc') ?? startUtcMs,
    plannedEndUtcMs: instant(line, 'planned_end_utc'),
    startUtcMs,
    endUtcMs,
    uStartS: uncertainty(line, 'u_start_s') ?? 0,
    uEndS: uncertainty(line, 'u_end_s'),
    angleStartDeg: number(line, 'angle_start_deg'),
    angleEndDeg: number(line, 'angle_end_deg'),
    outcome: line.cell('outcome') === '' ? null : oneOf(line, 'outcome', outcomes),
    angleSource: line.cell('angle_source') === '' ? 'counted' : oneOf(line, 'angle_source', angleSources),
    uAngleDeg: uncertainty(line, 'u_angle_deg'),
    good: good === '' ? null : good === 'true',
  };
}

function refuse(line: CsvRow, column: string, why: string): never {
  throw new UnusableArchive({ file: stepsFile, row: line.row, column }, why);
}

function number(line: CsvRow, column: string): number | null {
  const cell = line.cell(column).trim();
  if (cell === '') return null;
  const value = numberOfCell(cell);
  if (!Number.isFinite(value)) refuse(line, column, `"${cell}" is not a number`);
  return value;
}

function uncertainty(line: CsvRow, column: string): number | null {
  const value = number(line, column);
  if (value !== null && value < 0) refuse(line, column, `${value} is negative: an uncertainty cannot be`);
  return value;
}

function integer(line: CsvRow, column: string): number {
  const value = number(line, column);
  if (value === null || !Number.isInteger(value)) refuse(line, column, `"${line.cell(column)}" is not a whole number`);
  return value;
}

function instant(line: CsvRow, column: string): number | null {
  const cell = line.cell(column).trim();
  if (cell === '') return null;
  const utcMs = parseInstant(cell);
  if (Number.isNaN(utcMs)) refuse(line, column, `"${cell}" is not a UTC time such as 2026-03-01T22:00:00.000Z`);
  return utcMs;
}

function oneOf<T extends string>(line: CsvRow, column: string, allowed: readonly T[]): T {
  const cell = line.cell(column);
  const found = allowed.find((value) => value === cell);
  if (found === undefined) refuse(line, column, `"${cell}" is none of ${allowed.join(', ')}`);
  return found;
}
