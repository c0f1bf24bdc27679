import type { ImportMapping } from '@/shared/contracts/data';

/** A field that could not be read: what is wrong and what would be right. */
export class UnreadableField extends Error {}

const pointNumber = /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i;
const commaNumber = /^[+-]?(\d+(,\d+)?|,\d+)(e[+-]?\d+)?$/i;

/** Whether a field is a number with this decimal sign. No thousands separators, no words. */
export const isNumber = (text: string, decimal: ImportMapping['decimal']): boolean =>
  (decimal === '.' ? pointNumber : commaNumber).test(text.trim());

/**
 * A number as written with the stated decimal sign.
 * @throws UnreadableField for an empty field, NaN, an infinity, a thousands separator, any other text
 */
export function readNumber(field: string | undefined, decimal: ImportMapping['decimal'], what: string): number {
  const text = (field ?? '').trim();
  if (text === '') throw new UnreadableField(`the ${what} is empty; leave the whole row out where there is no measurement`);
  if (isNumber(text, decimal)) {
    const value = Number(decimal === ',' ? text.replace(',', '.') : text);
    if (Number.isFinite(value)) return value;
  }
  if (/^[+-]?(nan|inf(inity)?|null|na|n\/a)$/i.test(text))
    throw new UnreadableField(`the ${what} is ${text}; leave the whole row out where there is no measurement`);
  const other = decimal === '.' ? ',' : '.';
  const hint = isNumber(text, other)
    ? `it has the decimal sign "${other}", the mapping says "${decimal}"`
    : `write it like 12${decimal}5 or 1${decimal}25e-5, without thousands separators`;
  throw new UnreadableField(`the ${what} "${short(text)}" is no number: ${hint}`);
}

const short = (text: string) => (text.length > 40 ? `${text.slice(0, 37)}…` : text);

const isoPattern = /^(\d{4}-\d\d-\d\d)[T ](\d\d:\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s*(Z|[+-]\d\d(?::?\d\d)?)?$/i;

export const looksIso = (text: string): boolean => isoPattern.test(text.trim());
export const hasZone = (text: string): boolean => isoPattern.exec(text.trim())?.[5] !== undefined;
/** A date that reads differently in different countries, 03/04/2031 for example. */
export const looksLocalDate = (text: string): boolean =>
  /^\d{1,2}[./-]\d{1,2}[./-]\d{2,4}\b/.test(text.trim()) || /^\d{4}\/\d/.test(text.trim());

/**
 * An ISO 8601 instant as UTC ms with fraction.
 * @param zoneless what a time without zone means: `utc`, or nothing
 */
function readIso(field: string | undefined, zoneless: 'utc' | 'refuse'): number {
  const text = (field ?? '').trim();
  if (text === '') throw new UnreadableField('the time is empty');
  const match = isoPattern.exec(text);
  if (match === null) {
    const hint = looksLocalDate(text)
      ? 'it reads differently in different countries'
      : 'the mapping says ISO 8601, and all rows must be written in one way';
    throw new UnreadableField(`the time "${short(text)}" is not ISO 8601: ${hint}; write it like 2031-03-14T22:00:00.125Z`);
  }
  const [, day, minutes, seconds = '00', fraction = '', zone] = match;
  if (zone === undefined && zoneless === 'refuse')
    throw new UnreadableField(
      `the time "${short(text)}" names no zone; end it with Z for UTC or with an offset such as +01:00, or state that times without zone are UTC`,
    );
  const local = Date.parse(`${day}T${minutes}:${seconds}Z`);
  const utcMs = isUtc(zone) ? local : Date.parse(`${day}T${minutes}:${seconds}${offsetOf(zone)}`);
  // A day or an hour beyond the last is carried over by the parser of dates.
  if (!Number.isFinite(utcMs) || new Date(local).getUTCDate() !== Number(day?.slice(-2)))
    throw new UnreadableField(`the time "${short(text)}" does not exist in the calendar`);
  return utcMs + Number(`0.${fraction || '0'}`) * 1000;
}

const isUtc = (zone: string | undefined): zone is 'Z' | 'z' | undefined => zone === undefined || zone === 'Z' || zone === 'z';

/** +01, +0100 or +01:00 as +01:00. */
const offsetOf = (zone: string) => (zone.length === 3 ? `${zone}:00` : zone.includes(':') ? zone : `${zone.slice(0, 3)}:${zone.slice(3)}`);

/** The instant of a row as UTC ms by the mapping. */
export function readTime(field: string | undefined, mapping: ImportMapping): number {
  if (mapping.timeFormat === 'iso') return readIso(field, mapping.timesWithoutZoneAreUtc === true ? 'utc' : 'refuse');
  if (field !== undefined && looksIso(field))
    throw new UnreadableField(
      `the time "${short(field.trim())}" is written as a date, but the mapping says ${formatWords[mapping.timeFormat]}; all rows must be written in one way`,
    );
  const value = readNumber(field, mapping.decimal, 'time');
  if (mapping.timeFormat === 'epoch-s') return within(value * 1000, field);
  if (mapping.timeFormat === 'epoch-ms') return within(value, field);
  return Date.parse(mapping.elapsedFrom ?? '') + value * 1000;
}

const formatWords = {
  iso: 'ISO 8601',
  'epoch-s': 'seconds since 1970',
  'epoch-ms': 'milliseconds since 1970',
  'elapsed-s': 'seconds elapsed',
} as const;

const earliestMs = Date.UTC(1990, 0, 1);
const latestMs = Date.UTC(2200, 0, 1);

function within(utcMs: number, field: string | undefined): number {
  if (utcMs >= earliestMs && utcMs < latestMs) return utcMs;
  throw new UnreadableField(
    `the time "${short((field ?? '').trim())}" would be the year ${yearOf(utcMs)}: is the time format of the mapping right?`,
  );
}

const yearOf = (utcMs: number) => (Math.abs(utcMs) < 8.64e15 ? String(new Date(utcMs).getUTCFullYear()) : 'far outside the calendar');
