import { instantReader } from '@/shared/archive/instants';
import type { ImportMapping } from '@/shared/contracts/data';
import { localInstants } from '@/shared/protocol/local-time';

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

/** What a time means that names no zone: UTC ms of a local time (as if that were UTC, whole ms); null: it is refused. */
type Zoneless = ((localMs: number, text: string) => number) | null;

/** An ISO 8601 instant as UTC ms with fraction. */
function readIso(field: string | undefined, zoneless: Zoneless): number {
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
  if (zone === undefined && zoneless === null)
    throw new UnreadableField(
      `the time "${short(text)}" names no zone; end it with Z for UTC or with an offset such as +01:00, or state the zone of times without one`,
    );
  const local = Date.parse(`${day}T${minutes}:${seconds}Z`);
  // A day or an hour beyond the last is carried over by the parser of dates.
  if (!Number.isFinite(local) || new Date(local).getUTCDate() !== Number(day?.slice(-2)))
    throw new UnreadableField(`the time "${short(text)}" does not exist in the calendar`);
  const ms = Number(`0.${fraction || '0'}`) * 1000;
  if (zone === undefined) return (zoneless?.(local, text) ?? NaN) + ms;
  const utcMs = isUtc(zone) ? local : Date.parse(`${day}T${minutes}:${seconds}${offsetOf(zone)}`);
  if (!Number.isFinite(utcMs)) throw new UnreadableField(`the time "${short(text)}" has an offset from UTC that no zone has`);
  return utcMs + ms;
}

const isUtc = (zone: string): zone is 'Z' | 'z' => zone === 'Z' || zone === 'z';

const minuteMs = 60_000;

/** Local times of a zone as UTC; the offset is looked up once a minute, so that a column of times costs little more than one of UTC. */
function zonedBy(timeZone: string): NonNullable<Zoneless> {
  let minute = NaN;
  let offsetsMs: number[] = [];
  return (localMs, text) => {
    const now = Math.floor(localMs / minuteMs);
    if (now !== minute) {
      minute = now;
      const iso = new Date(now * minuteMs).toISOString();
      const found = localInstants({ date: iso.slice(0, 10), localTime: iso.slice(11, 16), timeZone });
      offsetsMs = found.map((utcMs) => now * minuteMs - utcMs);
    }
    const [offsetMs] = offsetsMs;
    if (offsetMs !== undefined && offsetsMs.length === 1) return localMs - offsetMs;
    throw new UnreadableField(
      offsetMs === undefined
        ? `the time "${short(text)}" did not exist in ${timeZone}, where the clocks were put forward past it: is the zone right?`
        : `the time "${short(text)}" came twice in ${timeZone}, where the clocks were put back; give such rows an offset, ${offsetsMs.map(offsetWords).join(' or ')}, or write UTC`,
    );
  };
}

/** -5400000 as -01:30. */
function offsetWords(offsetMs: number): string {
  const minutes = Math.abs(Math.round(offsetMs / minuteMs));
  const two = (count: number) => String(count).padStart(2, '0');
  return `${offsetMs < 0 ? '-' : '+'}${two(Math.floor(minutes / 60))}:${two(minutes % 60)}`;
}

/** +01, +0100 or +01:00 as +01:00. */
const offsetOf = (zone: string) => (zone.length === 3 ? `${zone}:00` : zone.includes(':') ? zone : `${zone.slice(0, 3)}:${zone.slice(3)}`);

const asUtc: NonNullable<Zoneless> = (localMs) => localMs;

/**
 * A reader of the instants of a mapping, UTC ms; it remembers what it saw last.
 * @throws UnreadableField (the reader) with what is wrong with a field and what would be right
 */
export function timeReader(mapping: ImportMapping): (field: string | undefined) => number {
  if (mapping.timeFormat !== 'iso') return (field) => readCount(field, mapping);
  const { timeZone, timesWithoutZoneAreUtc } = mapping;
  const zoneless = timeZone !== undefined ? zonedBy(timeZone) : timesWithoutZoneAreUtc === true ? asUtc : null;
  const plain = instantReader();
  return (field) => {
    // The way in which archives and exports write it is read several times faster.
    const utcMs = field === undefined ? NaN : plain(field);
    return Number.isNaN(utcMs) ? readIso(field, zoneless) : utcMs;
  };
}

/** Seconds or milliseconds from a beginning. */
function readCount(field: string | undefined, mapping: ImportMapping): number {
  if (field !== undefined && looksIso(field))
    throw new UnreadableField(
      `the time "${short(field.trim())}" is written as a date, but the mapping says ${formatWords[mapping.timeFormat]}; all rows must be written in one way`,
    );
  const value = readNumber(field, mapping.decimal, 'time');
  if (mapping.timeFormat === 'epoch-s') return within(value * 1000, field);
  if (mapping.timeFormat === 'epoch-ms') return within(value, field);
  return within(Date.parse(mapping.elapsedFrom ?? '') + value * 1000, field);
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
    `the time "${short((field ?? '').trim())}" would be ${yearOf(utcMs)}: is the time format of the mapping right?`,
  );
}

const yearOf = (utcMs: number) =>
  Math.abs(utcMs) < 8.64e15 ? `the year ${String(new Date(utcMs).getUTCFullYear())}` : 'far outside the calendar';
