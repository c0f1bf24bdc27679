import { parse, CsvError } from 'csv-parse/sync';
import { UnusableArchive } from './unusable-archive';

/** CSV as RFC 4180 has it, UTF-8, with a header, a decimal point and line feeds. */

const formulaStart = /^'?[=+\-@\t\r]/;

/** A text cell: spreadsheets would run a formula in it, so one that looks like one is marked with an apostrophe. */
export function textCell(value: string): string {
  return formulaStart.test(value) ? `'${value}` : value;
}

/** The text that `textCell` was given. */
export function textOfCell(cell: string): string {
  return cell.startsWith("'") && formulaStart.test(cell.slice(1)) ? cell.slice(1) : cell;
}

const decimal = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;

/** The decimal number in a cell, NaN where it holds none. Hexadecimal and the like, which JavaScript would read, are none. */
export function numberOfCell(cell: string): number {
  const text = cell.trim();
  return decimal.test(text) ? Number(text) : NaN;
}

/** One line of cells, quoted where the cell needs it. */
export function csvLine(cells: readonly string[]): string {
  return `${cells.map((cell) => (/[",\r\n]/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell)).join(',')}\n`;
}

/** Cells of one line under their column names, with the line's number in the file. */
export interface CsvRow {
  row: number;
  cell(column: string): string;
}

/**
 * Reads a CSV with a header.
 * @throws UnusableArchive naming the file, the row and what is wrong: a missing column, a row of the wrong length, a broken quote.
 */
export function readCsv(file: string, text: string, requiredColumns: readonly string[]): CsvRow[] {
  const records = parseRecords(file, text);
  const header = records[0]?.record;
  if (header === undefined)
    throw new UnusableArchive({ file }, `the file is empty; its first line must name the columns ${requiredColumns.join(', ')}`);
  const index = new Map(header.map((name, at) => [name.trim(), at]));
  const missing = requiredColumns.filter((name) => !index.has(name));
  if (missing.length > 0) {
    throw new UnusableArchive(
      { file, row: 1 },
      `${missing.length === 1 ? 'the column' : 'the columns'} ${missing.join(', ')} ${missing.length === 1 ? 'is' : 'are'} missing; found ${header.join(', ')}`,
    );
  }
  return records.slice(1).map(({ record, info }) => {
    if (record.length !== header.length) {
      throw new UnusableArchive({ file, row: info.lines }, `the row has ${record.length} cells, the header ${header.length}`);
    }
    return {
      row: info.lines,
      cell: (column) => {
        const at = index.get(column);
        return at === undefined ? '' : (record[at] as string);
      },
    };
  });
}

interface ParsedRecord {
  record: string[];
  info: { lines: number };
}

function parseRecords(file: string, text: string): ParsedRecord[] {
  try {
    return parse(text, { bom: true, info: true, relax_column_count: true, skip_empty_lines: true }) as unknown as ParsedRecord[];
  } catch (error) {
    if (!(error instanceof CsvError)) throw error;
    if (error.code === 'CSV_QUOTE_NOT_CLOSED')
      throw new UnusableArchive({ file, row: openQuoteRow(text) }, 'not readable as CSV: a quotation mark opens here that nothing closes');
    throw new UnusableArchive({ file, row: Number(error.lines ?? 0) }, `not readable as CSV: ${error.message}`);
  }
}

/** The line in which the quotation mark stands that is still open at the end. */
function openQuoteRow(text: string): number {
  let open = 0;
  text.split('\n').forEach((line, index) => {
    const changes = (line.split('"').length - 1) % 2 === 1;
    if (changes) open = open === 0 ? index + 1 : 0;
  });
  return open;
}
