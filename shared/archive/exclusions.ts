import { csvLine, readCsv, textCell, textOfCell } from './csv-text';
import { formatInstant, parseInstant } from './instants';
import { UnusableArchive } from './unusable-archive';

export const exclusionsFile = 'exclusions.csv';
export const exclusionColumns = ['start_utc', 'end_utc', 'reason'] as const;

/** A stretch of time whose samples are not used, and why (may be empty). */
export interface Exclusion {
  startUtcMs: number;
  endUtcMs: number;
  reason: string;
}

export function exclusionsCsv(exclusions: readonly Exclusion[]): string {
  const lines = exclusions.map((one) => csvLine([formatInstant(one.startUtcMs), formatInstant(one.endUtcMs), textCell(one.reason)]));
  return csvLine(exclusionColumns) + lines.join('');
}

/** @throws UnusableArchive naming the row of a stretch without a start or an end, or with its end before its start. */
export function readExclusions(text: string): Exclusion[] {
  return readCsv(exclusionsFile, text, ['start_utc', 'end_utc']).map((line) => {
    const [startUtcMs, endUtcMs] = (['start_utc', 'end_utc'] as const).map((column) => {
      const ms = parseInstant(line.cell(column).trim());
      if (Number.isNaN(ms)) {
        throw new UnusableArchive(
          { file: exclusionsFile, row: line.row, column },
          `"${line.cell(column)}" is not a UTC time such as 2026-03-01T22:00:00.000Z`,
        );
      }
      return ms;
    }) as [number, number];
    if (endUtcMs < startUtcMs)
      throw new UnusableArchive({ file: exclusionsFile, row: line.row, column: 'end_utc' }, 'the stretch ends before it starts');
    return { startUtcMs, endUtcMs, reason: textOfCell(line.cell('reason')) };
  });
}

/** Whether an instant lies in any of the stretches, both ends included. Ask in time order for speed. */
export function exclusionTest(exclusions: readonly Exclusion[]): (utcMs: number) => boolean {
  const sorted = [...exclusions].sort((a, b) => a.startUtcMs - b.startUtcMs);
  return (utcMs) => sorted.some((one) => one.startUtcMs <= utcMs && utcMs <= one.endUtcMs);
}
