import { NARROW_SPACE } from './format-number';

/**
 * Instants as people read them. Local times are always those of a named IANA zone (never the device's), and whoever
 * shows one shows the zone beside it; UTC instants show no finer digits than their uncertainty bears.
 */

export interface ClockOptions {
  timeZone: string;
  /** `short`: 05:46; `seconds`: 05:46:12; `ms`: 05:46:12.231 */
  precision?: 'short' | 'seconds' | 'ms' | undefined;
  /** Adds the day of the week: `05:46 Thu`. */
  weekday?: boolean | undefined;
}

const formatters = new Map<string, Intl.DateTimeFormat>();

function partsIn(utcMs: number, timeZone: string): Record<string, string> {
  let formatter = formatters.get(timeZone);
  if (!formatter) {
    formatter = new Intl.DateTimeFormat('en-GB', {
      timeZone,
      hourCycle: 'h23',
      year: 'numeric',
      month: '2-digit',
      day: '2-digit',
      weekday: 'short',
      hour: '2-digit',
      minute: '2-digit',
      second: '2-digit',
    });
    formatters.set(timeZone, formatter);
  }
  return Object.fromEntries(formatter.formatToParts(utcMs).map(({ type, value }) => [type, value]));
}

/** Time of day in the zone: `05:46`, `05:46 Thu`, `02:14:07.231`. Cut, not rounded, as clocks do. */
export function formatClock(utcMs: number, { timeZone, precision = 'short', weekday = false }: ClockOptions): string {
  if (!Number.isFinite(utcMs)) return '–';
  const parts = partsIn(utcMs, timeZone);
  const seconds = precision === 'short' ? '' : `:${parts['second']}`;
  const ms = precision === 'ms' ? `.${String(Math.floor(((utcMs % 1000) + 1000) % 1000)).padStart(3, '0')}` : '';
  return `${parts['hour']}:${parts['minute']}${seconds}${ms}${weekday ? ` ${parts['weekday']}` : ''}`;
}

/** Day in the zone: `2031-03-14`. */
export function formatDay(utcMs: number, timeZone: string): string {
  const parts = partsIn(utcMs, timeZone);
  return `${parts['year']}-${parts['month']}-${parts['day']}`;
}

/** Day and time with the zone: `2031-03-14 05:46, Europe/Oslo`. */
export function formatDayAndClock(utcMs: number, timeZone: string): string {
  return `${formatDay(utcMs, timeZone)} ${formatClock(utcMs, { timeZone })}, ${zoneName(timeZone)}`;
}

/** Time of day with the zone: `05:46 Thu, Europe/Oslo`. */
export function formatClockWithZone(utcMs: number, options: ClockOptions): string {
  return `${formatClock(utcMs, options)}, ${zoneName(options.timeZone)}`;
}

/** The zone as it stands beside a clock time: underscores are for computers. */
export function zoneName(timeZone: string): string {
  return timeZone.replaceAll('_', ' ');
}

/**
 * Time of day in UTC with as many decimals as u bears: those of u rounded to two digits, none below the microsecond:
 * u = 0.21 ms → `05:32:40.218 63`.
 */
export function formatUtcHonest(utcMs: number, uS: number | null): string {
  if (!Number.isFinite(utcMs)) return '–';
  const decimals = decimalsOf(uS);
  const dayMs = ((utcMs % 86_400_000) + 86_400_000) % 86_400_000;
  const unit = 10 ** -decimals;
  const rounded = Math.round(dayMs / 1000 / unit) * unit;
  const total = rounded >= 86_400 ? rounded - 86_400 : rounded;
  const h = Math.floor(total / 3600 + 1e-12);
  const min = Math.floor((total - h * 3600) / 60 + 1e-12);
  const [s = '0', fraction = ''] = Math.max(0, total - h * 3600 - min * 60)
    .toFixed(decimals)
    .split('.');
  const digits = fraction.replace(/(\d{3})(?=\d)/, `$1${NARROW_SPACE}`);
  return `${two(h)}:${two(min)}:${s.padStart(2, '0')}${digits === '' ? '' : `.${digits}`}`;
}

/** Local time minus UTC at an instant, ms. */
export function zoneOffsetMs(utcMs: number, timeZone: string): number {
  const parts = partsIn(utcMs, timeZone);
  const number = (name: string) => Number(parts[name]);
  const local = Date.UTC(number('year'), number('month') - 1, number('day'), number('hour'), number('minute'), number('second'));
  return local - Math.floor(utcMs / 1000) * 1000;
}

/** {@link formatUtcHonest} in local time of the zone. */
export function formatLocalHonest(utcMs: number, uS: number | null, timeZone: string): string {
  return Number.isFinite(utcMs) ? formatUtcHonest(utcMs + zoneOffsetMs(utcMs, timeZone), uS) : '–';
}

const two = (n: number) => String(n).padStart(2, '0');

function decimalsOf(uS: number | null): number {
  if (uS === null) return 3;
  if (!(uS > 0)) return 6;
  const last = Number(uS.toExponential(1).split('e')[1]) - 1;
  return Math.min(6, Math.max(0, -last));
}
