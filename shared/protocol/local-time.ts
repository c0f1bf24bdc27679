import { Temporal } from 'temporal-polyfill';

/**
 * Times of day in a protocol (`22:00`) are meant in the lab's zone and turned into instants here, across changes of the
 * clocks: a time that the spring change leaves out is the one an hour later, of a time that comes twice the first is meant.
 */

export interface LocalTimeInput {
  /** `HH:MM` */
  localTime: string;
  /** IANA zone, for example `Europe/Oslo`. */
  timeZone: string;
  /** The moment at which the step begins, UTC ms. */
  utcMs: number;
}

/** The occurrence on the local day `days` after the day of `utcMs`, UTC ms. */
function occurrenceMs({ localTime, timeZone, utcMs }: LocalTimeInput, days: number): number {
  const [hour = 0, minute = 0] = localTime.split(':').map(Number);
  const here = Temporal.Instant.fromEpochMilliseconds(Math.floor(utcMs)).toZonedDateTimeISO(timeZone);
  const day = here.toPlainDate().add({ days });
  return day.toZonedDateTime({ timeZone, plainTime: new Temporal.PlainTime(hour, minute) }).epochMilliseconds;
}

/** The first occurrence after `utcMs`, UTC ms: what `repeat until` means. */
export function nextOccurrenceUtcMs(input: LocalTimeInput): number {
  for (const days of [0, 1]) {
    const at = occurrenceMs(input, days);
    if (at > input.utcMs) return at;
  }
  return occurrenceMs(input, 2);
}

export interface WaitUntil {
  /** When the wait ends, UTC ms; the moment itself where the time is past and the protocol says to go on or to hold. */
  endUtcMs: number;
  /** The time was past when the step began, up to 12 h back. */
  past: boolean;
}

/**
 * What `wait until` a local time means at the moment `utcMs`: the nearest occurrence. One up to 12 h back is past, and
 * `ifPast` decides (`next day` waits for the occurrence on the following local day); any other is waited for.
 */
export function waitUntilLocalTime(input: LocalTimeInput & { ifPast: 'continue' | 'hold' | 'next day' }): WaitUntil {
  const { utcMs, ifPast } = input;
  const occurrences = [-1, 0, 1].map((days) => ({ days, at: occurrenceMs(input, days) }));
  const nearest = occurrences.reduce((best, next) => (Math.abs(next.at - utcMs) < Math.abs(best.at - utcMs) ? next : best));
  if (nearest.at >= utcMs) return { endUtcMs: nearest.at, past: false };
  return { endUtcMs: ifPast === 'next day' ? occurrenceMs(input, nearest.days + 1) : utcMs, past: true };
}

/** All instants at which the clocks of a zone show a time of day on a day: one, none or two where they change. UTC ms, in order. */
export function localInstants({ date, localTime, timeZone }: { date: string; localTime: string; timeZone: string }): number[] {
  const local = Temporal.PlainDateTime.from(`${date}T${localTime}`);
  const at = (disambiguation: 'earlier' | 'later') => local.toZonedDateTime(timeZone, { disambiguation });
  const both = [at('earlier'), at('later')].filter((found) => found.toPlainDateTime().equals(local));
  return [...new Set(both.map(({ epochMilliseconds }) => epochMilliseconds))];
}

/** When a day of a zone begins, or one so many days later; also where its clocks jump over midnight. UTC ms. */
export const dayStartUtcMs = (date: string, timeZone: string, daysLater = 0): number =>
  Temporal.PlainDate.from(date).add({ days: daysLater }).toZonedDateTime(timeZone).epochMilliseconds;
