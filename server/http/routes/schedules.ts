import * as contracts from '@/shared/contracts/schedules';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { findRig } from '@/server/store/rigs';
import * as starts from '@/server/store/schedule-starts';
import * as store from '@/server/store/schedules';
import { audited } from '../audited';
import { calendarOf, scheduleViewOf } from '../calendar';
import { calendarText } from '../calendar-text';
import { makeSchedule } from '../make-schedule';
import { isoOf, makerOf } from '../maker';
import { originForLinks } from '../origin';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import type { Services } from '../services';

const dayMs = 86_400_000;
const longestSpanDays = 70;
/** What a calendar program is shown: what was lately, and what is planned for two months. */
const feedDays = { back: 30, ahead: 60 };

async function load(services: Services, labId: string, scheduleId: string): Promise<store.ScheduleRecord> {
  const schedule = await store.findSchedule(services.database.db, labId, scheduleId);
  if (schedule === null) throw notFound('schedule');
  return schedule;
}

const stateWords = { active: 'It is active already.', paused: 'It is paused already.', ended: 'It has ended already.' };

const planning = [
  mount(contracts.listSchedules, async ({ membership, services }) => ({
    items: (await store.standingSchedules(services.database.db, membership.labId)).map(scheduleViewOf),
  })),

  mount(contracts.makeSchedule, async (context) => {
    const { revision: protocolRevision, ...wanted } = context.body;
    return scheduleViewOf(await makeSchedule(context, { ...wanted, protocolRevision, labId: context.membership.labId }));
  }),

  mount(contracts.changeSchedule, async (context) => {
    const { params, membership, services, body } = context;
    const schedule = await load(services, membership.labId, params.scheduleId);
    const nowUtcMs = services.clock.utcMs();
    const entry = { kind: `schedule.${body.state}`, data: () => ({ scheduleId: schedule.id }) };
    await audited(context, entry, async (tx) => {
      // Nothing that passed while it was paused is made up for.
      if (body.state === 'active') await store.setDecidedUntil(tx, schedule, nowUtcMs);
      if (await store.changeScheduleState(tx, { labId: schedule.labId, scheduleId: schedule.id }, { state: body.state, nowUtcMs })) return;
      throw new ProblemError(
        'not-possible-now',
        schedule.state === 'ended' ? 'The schedule has ended. Make a new one.' : stateWords[body.state],
      );
    });
    return scheduleViewOf(await load(services, membership.labId, schedule.id));
  }),

  mount(contracts.skipStart, async (context) => {
    const { params, membership, services, body, me } = context;
    const schedule = await load(services, membership.labId, params.scheduleId);
    const dueUtcMs = Date.parse(body.dueAt);
    const nowUtcMs = services.clock.utcMs();
    const [found] = occurrencesBetween(schedule.plan, membership.timeZone, { afterUtcMs: dueUtcMs - 1, untilUtcMs: dueUtcMs });
    if (found === undefined) throw notFound('start of the schedule');
    const at = formatDayAndClock(dueUtcMs, membership.timeZone);
    if (dueUtcMs <= nowUtcMs)
      throw new ProblemError('not-possible-now', `The start of ${at} is past. Only one that lies ahead can be skipped.`);
    const start = { labId: schedule.labId, scheduleId: schedule.id, dueAt: dueUtcMs };
    const entry = { kind: body.skipped ? 'schedule.skipped' : 'schedule.skip-taken-back', data: () => ({ ...start, dueAt: body.dueAt }) };
    await audited(context, entry, async (tx) => {
      const done = body.skipped
        ? await starts.decideStart(tx, start, { outcome: 'skipped', why: `Skipped by ${me.name}.`, nowUtcMs })
        : await starts.takeSkipBack(tx, start, nowUtcMs);
      if (!done)
        throw new ProblemError(
          'not-possible-now',
          body.skipped ? `The start of ${at} is skipped already.` : `The start of ${at} is not skipped.`,
        );
    });
    return body;
  }),

  mount(contracts.readCalendar, async ({ membership, services, query }) => {
    const [fromUtcMs, untilUtcMs] = [Date.parse(query.from), Date.parse(query.until)];
    if (untilUtcMs <= fromUtcMs || untilUtcMs - fromUtcMs > longestSpanDays * dayMs)
      throw new ProblemError(
        'invalid-input',
        `The calendar is read in spans of up to ${String(longestSpanDays)} days, "from" before "until".`,
      );
    const { labId, timeZone } = membership;
    return { items: await calendarOf(services.database.db, { labId, timeZone, fromUtcMs, untilUtcMs }) };
  }),
];

const rooms = [
  mount(contracts.readRoomHours, async ({ params, membership, services }) => {
    const { db } = services.database;
    if ((await findRig(db, membership.labId, params.rigId)) === null) throw notFound('rig');
    return store.hoursOfRoom(db, { labId: membership.labId, rigId: params.rigId });
  }),

  mount(contracts.changeRoomHours, async (context) => {
    const { params, membership, services, body } = context;
    if ((await findRig(services.database.db, membership.labId, params.rigId)) === null) throw notFound('rig');
    const rig = { labId: membership.labId, rigId: params.rigId };
    const entry = { kind: 'rig.hours-changed', data: () => ({ rigId: rig.rigId, hours: body }) };
    await audited(context, entry, (tx) => store.setRoomHours(tx, { ...rig, hours: body }, makerOf(context)));
    return body;
  }),
];

const feeds = [
  mount(contracts.readFeedState, async ({ membership, services, me }) => {
    const feed = await store.feedOf(services.database.db, membership.labId, me.userId);
    return { madeAt: feed === null ? null : isoOf(feed.madeAt) };
  }),

  mount(contracts.makeFeed, async (context) => {
    const { membership, services, me, req } = context;
    const token = services.newToken();
    const madeAt = services.clock.utcMs();
    const feed = { labId: membership.labId, userId: me.userId, tokenHash: services.sha256(token), madeAt };
    await audited(context, { kind: 'calendar-feed.made', data: () => ({}) }, (tx) => store.putFeed(tx, feed));
    return { address: `${originForLinks(req, services.config)}/api/calendars/${token}`, madeAt: isoOf(madeAt) };
  }),

  mount(contracts.endFeed, async (context) => {
    const { membership, me } = context;
    const entry = { kind: 'calendar-feed.ended', data: () => ({}) };
    await audited(context, entry, (tx) => store.deleteFeed(tx, membership.labId, me.userId));
    return undefined;
  }),

  mount(contracts.calendarFeed, async ({ params, services, req, res }) => {
    const { db } = services.database;
    const lab = await store.labOfFeed(db, services.sha256(params.token));
    if (lab === null) throw notFound('calendar');
    const nowUtcMs = services.clock.utcMs();
    const span = { ...lab, fromUtcMs: nowUtcMs - feedDays.back * dayMs, untilUtcMs: nowUtcMs + feedDays.ahead * dayMs };
    const facts = { labName: lab.labName, origin: originForLinks(req, services.config), nowUtcMs };
    res
      .set('Cache-Control', 'private, no-store')
      .type('text/calendar')
      .send(calendarText(await calendarOf(db, span), facts));
    return undefined;
  }),
];

export const scheduleRoutes = [...planning, ...rooms, ...feeds];
