import Papa from 'papaparse';
import type { ImportMapping } from '@/shared/contracts/data';

const rowsShown = 6;

/** The first bytes of a file as text; by the names of the WHATWG's Encoding Standard, whose windows-1252 holds all that Latin-1 prints. */
export const textOf = (head: ArrayBuffer, encoding: NonNullable<ImportMapping['encoding']>): string =>
  new TextDecoder(encoding === 'latin-1' ? 'windows-1252' : encoding).decode(head);

/** The first rows of a text as the chosen delimiter parts them. */
export function previewRows(head: string, delimiter: ImportMapping['delimiter']): string[][] {
  const parsed = Papa.parse<string[]>(head, { delimiter, preview: rowsShown + 1, skipEmptyLines: 'greedy' });
  return parsed.data;
}

/** Names of the columns: of the first row where it holds names, else counted. */
export function columnNames(rows: readonly string[][], headerRow: boolean): string[] {
  const count = rows.reduce((most, row) => Math.max(most, row.length), 0);
  return Array.from({ length: count }, (_, index) =>
    headerRow ? rows[0]?.[index]?.trim() || `column ${index + 1}` : `column ${index + 1}`,
  );
}
