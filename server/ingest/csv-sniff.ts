import { parse } from 'csv-parse/sync';
import type * as z from 'zod';
import type { ImportMapping, importPreviewSchema } from '@/shared/contracts/data';
import { hasZone, isNumber, looksIso, looksLocalDate } from './csv-fields';
import { readHead, UnreadableFile } from './csv-text';

export type ImportPreview = z.infer<typeof importPreviewSchema>;

const delimiters = [',', ';', '\t', '|', ' '];
/** Tried only where none of those parts anything. */
const rareDelimiters = ['^', '~', '!', '&', '%', '$', '@', '*', '=', '/', '\\', '_', '§', '¦'];
const rowsRead = 60;
const rowsShown = 12;

/**
 * Guesses how a CSV is to be read from its first bytes. What the file does not tell is listed under `ambiguous` and
 * carries a stand-in in the mapping that must be confirmed.
 * @param head first bytes of the file, 64 KiB are plenty
 * @param whole whether `head` is the whole file
 * @throws UnreadableFile when there is no table in it
 */
export function sniffCsv(head: Uint8Array, whole: boolean): ImportPreview {
  const { text, encoding } = readHead(head, whole);
  const tables = (signs: readonly string[]) => signs.map((sign) => tableOf(text, sign)).sort((a, b) => b.score - a.score);
  const usual = tables(delimiters);
  const [table, second] = ((usual[0]?.columns ?? 0) < 2 ? tables(rareDelimiters) : usual) as [Table, Table];
  if (table.columns < 2)
    throw new UnreadableFile(
      'No table was found: a row needs at least two columns, a time and a value, parted by a comma, semicolon, tab, bar or space.',
    );
  const ambiguous = new Set<keyof ImportMapping>();
  if (second.columns >= 2 && second.score === table.score) ambiguous.add('delimiter');
  const decimal = decimalOf(table, ambiguous);
  const headerRow = hasHeader(table, decimal);
  const header = headerRow ? (table.rows[0] ?? []) : [];
  const data = { rows: table.rows.slice(headerRow ? 1 : 0), columns: table.columns, header, decimal };
  if (data.rows.length === 0) throw new UnreadableFile('The file has a line of names and no row of data.');
  const timeColumn = timeColumnOf(data, ambiguous);
  const time = timeFormatOf(data, timeColumn, ambiguous);
  const valueColumn = valueColumnOf(data, timeColumn, ambiguous);
  const unit = unitOf(header[valueColumn] ?? '');
  if (unit === null) ambiguous.add('unit');
  const mapping: ImportMapping = {
    ...(encoding === 'utf-8' ? {} : { encoding }),
    delimiter: table.delimiter,
    decimal,
    headerRow,
    timeColumn,
    timeFormat: time,
    valueColumn,
    unit: unit ?? 'rad',
  };
  return {
    columns: Array.from({ length: table.columns }, (_, index) => ({
      index,
      name: header[index]?.trim() || `column ${String(index + 1)}`,
      sample: data.rows[0]?.[index] ?? '',
    })),
    rows: table.rows.slice(0, rowsShown),
    mapping,
    ambiguous: [...ambiguous],
  };
}

interface Table {
  delimiter: ImportMapping['delimiter'];
  rows: string[][];
  columns: number;
  /** Rows that agree on the number of columns and are made of numbers and times, over all rows. */
  score: number;
}

function tableOf(text: string, delimiter: Table['delimiter']): Table {
  const rows: string[][] = parse(text, {
    bom: true,
    delimiter,
    to: rowsRead,
    relax_column_count: true,
    relax_quotes: true,
    skip_empty_lines: true,
    comment: '#',
    comment_no_infix: true,
    trim: true,
    ignore_last_delimiters: false,
    skip_records_with_error: true,
  });
  const counts = new Map<number, number>();
  for (const row of rows) counts.set(row.length, (counts.get(row.length) ?? 0) + 1);
  const columns = [...counts].sort((a, b) => b[1] - a[1])[0]?.[0] ?? 0;
  const readable = rows.filter((row) => row.length === columns && row.every(isReadable)).length;
  return { delimiter, rows, columns, score: columns < 2 ? 0 : readable / Math.max(1, rows.length) };
}

const isReadable = (field: string) =>
  field === '' || isNumber(field, '.') || isNumber(field, ',') || looksIso(field) || looksLocalDate(field) || /^nan$/i.test(field);

/** Comma fields that could as well be thousands (1,234) decide nothing. */
function decimalOf(table: Table, ambiguous: Set<keyof ImportMapping>): ImportMapping['decimal'] {
  const fields = table.rows.flat();
  if (fields.some((field) => field.includes('.') && isNumber(field, '.'))) return '.';
  const withComma = fields.filter((field) => field.includes(',') && isNumber(field, ','));
  if (withComma.length === 0) return '.';
  if (withComma.every((field) => /^[+-]?[1-9]\d{0,2},\d{3}$/.test(field))) ambiguous.add('decimal');
  return ',';
}

const isData = (field: string, decimal: ImportMapping['decimal']) =>
  isNumber(field, decimal) || looksIso(field) || looksLocalDate(field) || field === '';

const hasHeader = (table: Table, decimal: ImportMapping['decimal']) =>
  table.rows.length > 0 && !(table.rows[0] ?? []).every((field) => isData(field, decimal) || /^nan$/i.test(field));

interface Data {
  rows: string[][];
  columns: number;
  header: string[];
  decimal: ImportMapping['decimal'];
}

const columnOf = (data: Data, index: number) => data.rows.map((row) => row[index] ?? '').filter((field) => field !== '');

function timeColumnOf(data: Data, ambiguous: Set<keyof ImportMapping>): number {
  const indices = Array.from({ length: data.columns }, (_, index) => index);
  const dated = indices.filter((index) => columnOf(data, index).some((field) => looksIso(field) || looksLocalDate(field)));
  if (dated.length === 1) return dated[0] as number;
  const among = dated.length > 0 ? dated : indices;
  const named = among.filter((index) =>
    /(^|[^a-z])(time|utc|epoch|timestamp|date|elapsed|t|sec|seconds)([^a-z]|$)/i.test(data.header[index] ?? ''),
  );
  if (named.length === 1) return named[0] as number;
  const rising = among.filter((index) => rises(columnOf(data, index), data.decimal));
  if (rising.length === 1) return rising[0] as number;
  ambiguous.add('timeColumn');
  return rising[0] ?? among[0] ?? 0;
}

function rises(fields: string[], decimal: ImportMapping['decimal']): boolean {
  const values = fields.filter((field) => isNumber(field, decimal)).map((field) => Number(field.replace(',', '.')));
  return (
    values.length >= 2 &&
    values.length === fields.length &&
    values.every((value, index) => index === 0 || value > (values[index - 1] as number))
  );
}

function timeFormatOf(data: Data, timeColumn: number, ambiguous: Set<keyof ImportMapping>): ImportMapping['timeFormat'] {
  const fields = columnOf(data, timeColumn);
  const iso = fields.filter(looksIso);
  if (iso.length > 0) {
    if (iso.length < fields.length) ambiguous.add('timeFormat');
    if (!iso.every(hasZone)) ambiguous.add('timesWithoutZoneAreUtc');
    return 'iso';
  }
  const first = Number((fields[0] ?? '').replace(',', '.'));
  if (first >= 6e8 && first < 1e10) return 'epoch-s';
  if (first >= 6e11 && first < 1e13) return 'epoch-ms';
  if (!Number.isFinite(first) || Math.abs(first) >= 1e8) ambiguous.add('timeFormat');
  ambiguous.add('elapsedFrom');
  return 'elapsed-s';
}

function valueColumnOf(data: Data, timeColumn: number, ambiguous: Set<keyof ImportMapping>): number {
  const numeric = Array.from({ length: data.columns }, (_, index) => index).filter(
    (index) => index !== timeColumn && columnOf(data, index).some((field) => isNumber(field, data.decimal)),
  );
  if (numeric.length === 1) return numeric[0] as number;
  const named = numeric.filter((index) => /deflection|theta|angle|spot|position/i.test(data.header[index] ?? ''));
  if (named.length === 1) return named[0] as number;
  ambiguous.add('valueColumn');
  return named[0] ?? numeric[0] ?? (timeColumn === 0 ? 1 : 0);
}

/** The unit that a column's name states: in brackets or as its last word. */
export function unitOf(name: string): ImportMapping['unit'] | null {
  const match = /(?:^|[\s_([/])(rad|mrad|[uµμ]rad|m|mm|microrad)\s*[)\]]?\s*$/i.exec(name.trim());
  const unit = match?.[1]?.toLowerCase().replace(/^[µμ]|^micro/, 'u');
  return unit === 'rad' || unit === 'mrad' || unit === 'urad' || unit === 'm' || unit === 'mm' ? unit : null;
}
