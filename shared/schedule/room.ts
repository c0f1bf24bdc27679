import { formatClock, formatDay } from '../lib/format-time';
import { nextOccurrenceUtcMs } from '../protocol/durations';
import type { RoomHours } from './plan';

export interface Stay {
  startUtcMs: number;
  endUtcMs: number;
}

const dayMs = 86_400_000;

/** Whether two stays share a moment. */
export const overlap = (a: Stay, b: Stay): boolean => a.startUtcMs < b.endUtcMs && b.startUtcMs < a.endUtcMs;

/** Why a stay may not be in the room, in one sentence; null where nothing stands against it. */
export function againstRoom(hours: RoomHours, stay: Stay, timeZone: string): string | null {
  // One that ends at midnight is not in the room on the day after.
  const [first, last] = [stay.startUtcMs, Math.max(stay.startUtcMs, stay.endUtcMs - 1)].map((utcMs) => formatDay(utcMs, timeZone)) as [
    string,
    string,
  ];
  const blackout = hours.blackouts.find(({ from, until }) => from <= last && first <= until);
  if (blackout !== undefined)
    return first >= blackout.from
      ? `${first} is a blackout date: ${blackout.why}.`
      : `It would go on into ${blackout.from}, which is a blackout date: ${blackout.why}.`;
  const { nightWindow } = hours;
  if (nightWindow === null || withinWindow(nightWindow, stay, timeZone)) return null;
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone });
  return `It would take from ${clock(stay.startUtcMs)} to ${clock(stay.endUtcMs)}; the night window of the room is ${nightWindow.from} to ${nightWindow.until}.`;
}

/** When the window ends in which a stay begins, UTC ms. */
export const endOfWindow = ({ until }: { until: string }, { startUtcMs, timeZone }: { startUtcMs: number; timeZone: string }): number =>
  nextOccurrenceUtcMs({ localTime: until, timeZone, utcMs: startUtcMs });

/** By the clocks on the wall: it starts within the window, and ends in the same night before the window does. */
function withinWindow({ from, until }: { from: string; until: string }, { startUtcMs, endUtcMs }: Stay, timeZone: string): boolean {
  const start = formatClock(startUtcMs, { timeZone });
  const end = formatClock(endUtcMs, { timeZone });
  if (endUtcMs - startUtcMs > dayMs) return false;
  const sameDay = formatDay(startUtcMs, timeZone) === formatDay(endUtcMs, timeZone);
  // Where clocks go back, a stay may end at an earlier time of day than it began.
  const inMorning = sameDay && start <= until && end <= until;
  if (from < until) return start >= from && inMorning;
  return start >= from ? sameDay || end <= until : inMorning;
}
