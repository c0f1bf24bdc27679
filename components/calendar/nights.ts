import type { CalendarItem } from '@/shared/contracts/schedules';
import { formatDay } from '@/shared/lib/format-time';
import { localInstants } from '@/shared/protocol/local-time';

/** From noon to noon of the lab's clocks: runs go through the night, and a day would cut each in two. */
export interface Night {
  /** Local day on which it begins, `YYYY-MM-DD`. */
  day: string;
  fromUtcMs: number;
  untilUtcMs: number;
}

const dayMs = 86_400_000;

/** The day `days` after a day of the calendar. */
export const dayAfter = (day: string, days: number): string =>
  new Date(Date.parse(`${day}T12:00:00Z`) + days * dayMs).toISOString().slice(0, 10);

const noonOf = (day: string, timeZone: string) =>
  localInstants({ date: day, localTime: '12:00', timeZone })[0] ?? Date.parse(`${day}T12:00Z`);

/** Nights in order from the one that begins on `day`: 23 or 25 h long where the clocks change in it. */
export const nightsFrom = (day: string, count: number, timeZone: string): Night[] =>
  Array.from({ length: count }, (_, index) => {
    const first = dayAfter(day, index);
    return { day: first, fromUtcMs: noonOf(first, timeZone), untilUtcMs: noonOf(dayAfter(first, 1), timeZone) };
  });

/** The night that an instant belongs to: before noon it is the one of the day before. */
export function nightDayOf(utcMs: number, timeZone: string): string {
  const day = formatDay(utcMs, timeZone);
  return utcMs < noonOf(day, timeZone) ? dayAfter(day, -1) : day;
}

/** Monday of the week of a day. */
export const mondayOf = (day: string): string => dayAfter(day, -((new Date(`${day}T12:00:00Z`).getUTCDay() + 6) % 7));

export interface Bar {
  item: CalendarItem;
  /** Share of the night before it and share it takes, 0 to 1. */
  left: number;
  width: number;
}

const shortestShare = 0.012;

/** What of the items falls into a night. */
export function barsOf(items: readonly CalendarItem[], { fromUtcMs, untilUtcMs }: Night): Bar[] {
  const length = untilUtcMs - fromUtcMs;
  return items.flatMap((item) => {
    const from = Math.max(Date.parse(item.dueAt), fromUtcMs);
    const until = Math.min(Math.max(Date.parse(item.endsAt), Date.parse(item.dueAt) + 1), untilUtcMs);
    if (from >= until) return [];
    return [{ item, left: (from - fromUtcMs) / length, width: Math.max((until - from) / length, shortestShare) }];
  });
}

/** Items by the local day on which they start. */
export function byDay(items: readonly CalendarItem[], timeZone: string): { day: string; items: CalendarItem[] }[] {
  const days = new Map<string, CalendarItem[]>();
  for (const item of items) {
    const day = formatDay(Date.parse(item.dueAt), timeZone);
    days.set(day, [...(days.get(day) ?? []), item]);
  }
  return [...days].map(([day, found]) => ({ day, items: found }));
}

const dayNames = ['Sun', 'Mon', 'Tue', 'Wed', 'Thu', 'Fri', 'Sat'];
const monthNames = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];

/** `Fri 14 Feb` */
export function dayWords(day: string): string {
  const date = new Date(`${day}T12:00:00Z`);
  return `${dayNames[date.getUTCDay()] ?? ''} ${String(date.getUTCDate())} ${monthNames[date.getUTCMonth()] ?? ''}`;
}
