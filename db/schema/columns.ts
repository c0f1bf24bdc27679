import { customType } from 'drizzle-orm/pg-core';

const uuidPattern = /^[0-9a-f]{8}-[0-9a-f]{4}-[0-9a-f]{4}-[0-9a-f]{4}-[0-9a-f]{12}$/i;
const nilUuid = '00000000-0000-0000-0000-000000000000';

/** Whether `id` has the form of an id of the database. */
export const isKey = (id: string): boolean => uuidPattern.test(id);

/**
 * The id of a row: a UUID. Ids come from addresses that people type and share, and one that is no UUID names nothing:
 * it is compared as the nil UUID, which no row bears, so that a lookup finds nothing instead of failing.
 */
export const key = customType<{ data: string; driverData: string }>({
  dataType: () => 'uuid',
  toDriver: (id) => (isKey(id) ? id : nilUuid),
});

/**
 * An instant: timestamptz in the database, UTC milliseconds with fraction in the program. Microseconds are kept both
 * ways (a double near 1.8e12 resolves 0.25 µs), which the driver's own Date would cut to milliseconds.
 */
export const instant = customType<{ data: number; driverData: string }>({
  dataType: () => 'timestamp (6) with time zone',
  toDriver: timestampOfUtcMs,
  fromDriver: utcMsOfTimestamp,
});

/** UTC milliseconds as PostgreSQL's text, rounded to the microsecond. */
export function timestampOfUtcMs(utcMs: number): string {
  if (!Number.isFinite(utcMs)) throw new RangeError(`an instant is a finite number of milliseconds, got ${utcMs}`);
  const totalUs = Math.round(utcMs * 1000);
  const wholeMs = Math.floor(totalUs / 1000);
  const us = totalUs - wholeMs * 1000;
  return `${new Date(wholeMs).toISOString().slice(0, -1)}${String(us).padStart(3, '0')}Z`;
}

/** PostgreSQL's text of a timestamptz (`2031-05-06 07:08:09.123456+00`) as UTC milliseconds with fraction. */
export function utcMsOfTimestamp(text: string | Date): number {
  if (text instanceof Date) return text.getTime();
  const match = /^(\d{4}-\d\d-\d\d)[ T](\d\d:\d\d:\d\d)(?:\.(\d{1,6}))?(Z|[+-]\d\d(?::?\d\d)?)$/.exec(text);
  if (match === null) throw new Error(`not a timestamp with time zone: ${text}`);
  const [, day, time, fraction = '', zone = 'Z'] = match;
  const offset = zone === 'Z' ? 'Z' : zone.length === 3 ? `${zone}:00` : zone;
  return Date.parse(`${day}T${time}${offset}`) + Number(fraction.padEnd(6, '0')) / 1000;
}

/** Raw bytes. */
export const bytea = customType<{ data: Buffer; driverData: Buffer }>({ dataType: () => 'bytea' });
