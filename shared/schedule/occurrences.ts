import { Cron } from 'croner';
import { formatClock, formatDay } from '../lib/format-time';
import { localInstants } from '../protocol/local-time';
import { weekdays, type SchedulePlan } from './plan';

export interface Occurrence {
  dueUtcMs: number;
  /** What the time of day means where the clocks change that night; null on all other days. */
  remark: string | null;
}

export interface Span {
  /** Before the first instant that counts, UTC ms. */
  afterUtcMs: number;
  /** The last instant that counts, UTC ms. */
  untilUtcMs: number;
  atMost?: number;
}

/**
 * When a schedule starts in a span of time, in order. A time of day that the spring change leaves out is the moment of the change;
 * of a time that comes twice in autumn the first is meant.
 */
export function occurrencesBetween(plan: SchedulePlan, timeZone: string, { afterUtcMs, untilUtcMs, atMost = 500 }: Span): Occurrence[] {
  const found: Occurrence[] = [];
  const starts = startsOf(plan, timeZone);
  let at = new Date(Math.floor(afterUtcMs));
  while (found.length < atMost) {
    const next = starts.nextRun(at);
    if (next === null || next.getTime() > untilUtcMs) break;
    at = next;
    const dueUtcMs = next.getTime();
    const day = formatDay(dueUtcMs, timeZone);
    if (plan.kind === 'weekly' && plan.until !== null && day > plan.until) break;
    if (plan.kind === 'once' || day >= plan.from) found.push({ dueUtcMs, remark: remarkOn(plan.time, timeZone, dueUtcMs) });
  }
  return found;
}

function startsOf(plan: SchedulePlan, timezone: string): Cron {
  const [hour, minute] = plan.time.split(':').map(Number);
  const clock = `0 ${String(minute)} ${String(hour)}`;
  if (plan.kind === 'weekly') return new Cron(`${clock} * * ${plan.days.map((day) => weekdays.indexOf(day) + 1).join(',')}`, { timezone });
  const [year, month, day] = plan.date.split('-').map(Number);
  return new Cron(`${clock} ${String(day)} ${String(month)} * ${String(year)}`, { timezone });
}

function remarkOn(time: string, timeZone: string, dueUtcMs: number): string | null {
  const shown = formatClock(dueUtcMs, { timeZone });
  if (shown !== time) return `The clocks change: ${time} does not exist on this day. It starts at ${shown}.`;
  const all = localInstants({ date: formatDay(dueUtcMs, timeZone), localTime: time, timeZone });
  return all.length > 1 ? `The clocks change: ${time} comes twice on this day. It starts at the first.` : null;
}
