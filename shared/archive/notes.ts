import { csvLine, textCell } from './csv-text';
import { formatInstant } from './instants';

export const notesFile = 'notes.csv';
export const noteColumns = ['seq', 'at_utc', 'by', 'text'] as const;

/** What somebody wrote to a row of the step log. No evaluation reads it. */
export interface StepNote {
  /** Row of steps.csv. */
  seq: number;
  atUtcMs: number;
  by: string;
  text: string;
}

export function notesCsv(notes: readonly StepNote[]): string {
  const lines = notes.map(({ seq, atUtcMs, by, text }) => csvLine([String(seq), formatInstant(atUtcMs), textCell(by), textCell(text)]));
  return csvLine(noteColumns) + lines.join('');
}
