import { Temporal } from 'temporal-polyfill';
import { weekdays, type SchedulePlan } from '@/shared/schedule/plan';

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
export function temporalStarts(
  plan: SchedulePlan & { kind: 'weekly' },
  timeZone: string,
  { fromMs, untilMs }: { fromMs: number; untilMs: number },
): number[] {
  const found: number[] = [];
  const time = Temporal.PlainTime.from(plan.time);
  const dayOf = (ms: number) => Temporal.Instant.fromEpochMilliseconds(ms).toZonedDateTimeISO(timeZone).toPlainDate();
  const last = dayOf(untilMs);
  for (let day = dayOf(fromMs).subtract({ days: 1 }); Temporal.PlainDate.compare(day, last) <= 0; day = day.add({ days: 1 })) {
    const name = weekdays[day.dayOfWeek - 1];
    if (name === undefined || !plan.days.includes(name) || day.toString() < plan.from) continue;
    if (plan.until !== null && day.toString() > plan.until) continue;
    const local = day.toPlainDateTime(time);
    const earlier = local.toZonedDateTime(timeZone, { disambiguation: 'earlier' });
    const exists = earlier.toPlainDateTime().equals(local);
    const at = exists ? earlier.epochMilliseconds : (earlier.getTimeZoneTransition('next')?.epochMilliseconds ?? NaN);
    if (at > fromMs && at <= untilMs) found.push(at);
  }
  return found;
}
