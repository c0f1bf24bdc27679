import ical, { ICalEventStatus } from 'ical-generator';
import type { CalendarItem } from '@/shared/contracts/schedules';

export interface FeedFacts {
  labName: string;
  /** Address of the server as people reach it. */
  origin: string;
  nowUtcMs: number;
}

const words: Record<CalendarItem['state'], string> = {
  planned: 'Planned',
  blocked: 'Blocked',
  paused: 'Paused',
  skipped: 'Skipped',
  started: 'Started',
  missed: 'Missed',
};
/** What was planned once and will not be, or was not, stays in the calendar, crossed out. */
const cancelled: readonly CalendarItem['state'][] = ['blocked', 'skipped', 'missed'];
const refreshS = 900;

/** What is planned as iCalendar (RFC 5545), all instants in UTC. A start keeps its UID whatever becomes of it. */
export function calendarText(items: readonly CalendarItem[], { labName, origin, nowUtcMs }: FeedFacts): string {
  const calendar = ical({
    name: labName,
    prodId: { company: 'Evenfall', product: 'Evenfall', language: 'EN' },
    ttl: refreshS,
    url: `${origin}/calendar`,
  });
  for (const item of items)
    calendar.createEvent({
      id: `${item.scheduleId}.${String(Date.parse(item.dueAt))}@evenfall`,
      sequence: sequenceOf(item),
      stamp: new Date(nowUtcMs),
      start: new Date(item.dueAt),
      end: new Date(item.endsAt),
      summary: `${item.rigName}: ${item.protocolName}, revision ${String(item.protocolRevision)}`,
      description: [`${words[item.state]}.`, item.why, item.remark ?? '', 'Do not enter the room while it goes on.']
        .filter(Boolean)
        .join(' '),
      location: item.rigName,
      status: statusOf(item),
      url: item.runId === null ? `${origin}/calendar` : `${origin}/runs/${item.runId}`,
    });
  return calendar.toString();
}

/** One whose schedule is paused may yet be. */
function statusOf({ state }: CalendarItem): ICalEventStatus {
  if (state === 'paused') return ICalEventStatus.TENTATIVE;
  return cancelled.includes(state) ? ICalEventStatus.CANCELLED : ICalEventStatus.CONFIRMED;
}

/** Before any change; in s from here on the number has room until 2088. */
const firstUtcMs = Date.UTC(2020, 0);

/** Rises with each change (RFC 5545 3.8.7.4): a program that has heard of a skip or a pause must hear of it when that is over. */
const sequenceOf = ({ changedAt }: CalendarItem): number =>
  changedAt === null ? 0 : Math.max(0, Math.floor((Date.parse(changedAt) - firstUtcMs) / 1000));
