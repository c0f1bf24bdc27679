import { Temporal } from 'temporal-polyfill';
import { weekdays, type RoomHours, type SchedulePlan } from '@/shared/schedule/plan';
import type { Stay } from '@/shared/schedule/room';

/**
 * Local times by an independent reckoning: the TC39 Temporal proposal (its polyfill), which looks each day up in the IANA data, where
 * the product steps with a cron library. Lord Howe changes its clocks by 30 minutes, Apia left out a whole day in 2011.
 */
export const zones = [
  'Europe/Zurich',
  'Europe/London',
  'America/New_York',
  'America/St_Johns',
  'Australia/Lord_Howe',
  'Pacific/Auckland',
  'Asia/Tehran',
  'Africa/Casablanca',
] as const;

/** UTC ms of the starts in a span, day by day: the first instant of the time of day, or where it is left out the instant of the change. */
export function temporalStarts(plan: SchedulePlan, timeZone: string, { fromMs, untilMs }: { fromMs: number; untilMs: number }): number[] {
  const found: number[] = [];
  const time = Temporal.PlainTime.from(plan.time);
  const dayOf = (ms: number) => Temporal.Instant.fromEpochMilliseconds(ms).toZonedDateTimeISO(timeZone).toPlainDate();
  const last = dayOf(untilMs);
  for (let day = dayOf(fromMs).subtract({ days: 1 }); Temporal.PlainDate.compare(day, last) <= 0; day = day.add({ days: 1 })) {
    if (!isDay(plan, day)) continue;
    const local = day.toPlainDateTime(time);
    const earlier = local.toZonedDateTime(timeZone, { disambiguation: 'earlier' });
    const exists = earlier.toPlainDateTime().equals(local);
    const at = exists ? earlier.epochMilliseconds : (earlier.getTimeZoneTransition('next')?.epochMilliseconds ?? NaN);
    if (at > fromMs && at <= untilMs) found.push(at);
  }
  return found;
}

function isDay(plan: SchedulePlan, day: Temporal.PlainDate): boolean {
  if (plan.kind === 'once') return day.equals(plan.date);
  const name = weekdays[day.dayOfWeek - 1];
  if (name === undefined || !plan.days.includes(name) || day.toString() < plan.from) return false;
  return plan.until === null || day.toString() <= plan.until;
}

/** Whether a stay may be in the room: it shares no moment with the days of a blackout, and by the clocks on the wall both its ends lie within the window of one night. */
export function temporalRoom({ nightWindow, blackouts }: RoomHours, stay: Stay, timeZone: string): boolean {
  const midnight = (day: Temporal.PlainDate) => day.toZonedDateTime(timeZone).epochMilliseconds;
  const isBlocked = blackouts.some(({ from, until }) => {
    const [opens, closes] = [midnight(Temporal.PlainDate.from(from)), midnight(Temporal.PlainDate.from(until).add({ days: 1 }))];
    return stay.startUtcMs < closes && opens < stay.endUtcMs;
  });
  if (isBlocked) return false;
  if (nightWindow === null) return true;
  if (stay.endUtcMs - stay.startUtcMs > 86_400_000) return false;
  const [start, end] = [stay.startUtcMs, stay.endUtcMs].map((ms) =>
    Temporal.Instant.fromEpochMilliseconds(ms).toZonedDateTimeISO(timeZone).toPlainDateTime(),
  ) as [Temporal.PlainDateTime, Temporal.PlainDateTime];
  const day = start.toPlainDate();
  const { from, until } = nightWindow;
  const passesMidnight = Temporal.PlainTime.compare(from, until) >= 0;
  return [0, 1].some((nights) => {
    const first = day.subtract({ days: nights });
    const opens = first.toPlainDateTime(from);
    const closes = first.add({ days: passesMidnight ? 1 : 0 }).toPlainDateTime(until);
    return [start, end].every((at) => Temporal.PlainDateTime.compare(opens, at) <= 0 && Temporal.PlainDateTime.compare(at, closes) <= 0);
  });
}
