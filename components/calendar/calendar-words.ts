import type { IconName, Tone } from '@/components/ui';
import type { CalendarItem } from '@/shared/contracts/schedules';
import type { SchedulePlan, Weekday } from '@/shared/schedule/plan';
import { weekdays } from '@/shared/schedule/plan';
import { dayWords } from './nights';

export const stateMarks: Record<CalendarItem['state'], { word: string; icon: IconName; tone: Tone; bar: string }> = {
  planned: { word: 'Planned', icon: 'wait', tone: 'lamp', bar: 'bg-lamp border-lamp' },
  blocked: { word: 'Blocked', icon: 'warning', tone: 'danger', bar: 'bg-ink border-danger border-dashed' },
  paused: { word: 'Paused', icon: 'hold', tone: 'dim', bar: 'bg-ink border-faint border-dashed' },
  skipped: { word: 'Skipped', icon: 'forward', tone: 'dim', bar: 'bg-ink border-faint border-dashed' },
  started: { word: 'Started', icon: 'passed', tone: 'good', bar: 'bg-good border-good' },
  missed: { word: 'Missed', icon: 'failed', tone: 'danger', bar: 'bg-ink border-danger' },
};

export const weekdayWords: Record<Weekday, string> = { mon: 'Mon', tue: 'Tue', wed: 'Wed', thu: 'Thu', fri: 'Fri', sat: 'Sat', sun: 'Sun' };

/** `Mon, Wed, Fri at 22:00, until Fri 28 Mar` */
export function planWords(plan: SchedulePlan): string {
  if (plan.kind === 'once') return `Once, ${dayWords(plan.date)} at ${plan.time}`;
  const days =
    plan.days.length === 7
      ? 'Every day'
      : weekdays
          .filter((day) => plan.days.includes(day))
          .map((day) => weekdayWords[day])
          .join(', ');
  return `${days} at ${plan.time}${plan.until === null ? '' : `, until ${dayWords(plan.until)}`}`;
}
