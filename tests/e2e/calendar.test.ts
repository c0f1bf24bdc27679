import { demoIds } from '@/db/demo/seed';
import { formatDay } from '@/shared/lib/format-time';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Story 3, its calendar: a run is scheduled, seen in three views, skipped and taken back; rooms have hours. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const zone = 'Europe/Zurich';
const dayMs = 86_400_000;

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'keeper'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('a run is scheduled for some nights of the week; its next starts are shown before', async () => {
    await hand.goes('/calendar', 'calendar-screen');
    // What another size left behind is past or ended.
    await hand.sees('Nothing is scheduled');
    await hand.taps('schedule-a-run');
    await hand.tapsOn('On days of the week', 'radio');
    await hand.taps('day-sat');
    await hand.taps('day-sun');
    // In two weeks, whatever day it is: all of seven days.
    await hand.types('schedule-date', formatDay(Date.now() + 14 * dayMs, zone));
    await hand.types('schedule-time', '23:30');
    await hand.reads('next-starts', /The next starts, Europe\/Zurich.*(23:30.*){3}/);
    await hand.shoots('schedule-sheet');
    await hand.types('schedule-date', formatDay(Date.now(), zone));
    await hand.taps('schedule-confirm');
    await hand.at('schedule-sheet').waitFor({ state: 'detached' });
    await hand.reads('schedule', /Every day at 23:30.*North bench/);
    await hand.reads('start-row', /23:30.*Planned/);
    await hand.shoots('calendar-list');
  });

  chapter('one that would meet it is refused, and says with whom', async () => {
    await hand.taps('schedule-a-run');
    await hand.types('schedule-time', '23:31');
    await hand.types('schedule-date', formatDay(Date.now() + 2 * dayMs, zone));
    await hand.taps('schedule-confirm');
    await hand.sees(/North bench is taken then: Casimir Thornquist scheduled/);
    expect(await hand.at('schedule-time').inputValue()).toBe('23:31');
    await hand.shoots('schedule-refused');
    await hand.taps('sheet-close');
  });

  chapter('the week shows nights from noon to noon, the day one night rig by rig', async () => {
    await hand.tapsOn('Week', 'radio');
    await hand.at('week-view').waitFor();
    await hand.taps('later');
    await hand.page
      .getByRole('button', { name: /North bench, .* 23:30 to .*: Planned/ })
      .first()
      .waitFor();
    expect(await hand.page.getByTestId('night-row').count()).toBe(7);
    await hand.shoots('calendar-week');
    await hand.tapsOn('Day', 'radio');
    await hand.at('day-view').waitFor();
    await hand.shoots('calendar-day');
  });

  chapter('one start is skipped and taken back', async () => {
    await hand.taps(hand.page.getByRole('button', { name: /23:30 to .*: Planned/ }).first());
    await hand.taps('skip-start');
    await hand.at('start-sheet').waitFor({ state: 'detached' });
    await hand.taps(hand.page.getByRole('button', { name: /23:30 to .*: Skipped/ }).first());
    await hand.reads('start-sheet', 'Skipped by Casimir Thornquist.');
    await hand.shoots('calendar-skipped');
    await hand.taps('take-skip-back');
    await hand.page
      .getByRole('button', { name: /23:30 to .*: Planned/ })
      .first()
      .waitFor();
  });

  chapter('hours of the room stand against a start, and say so', async () => {
    await hand.taps('change-hours');
    await hand.taps('has-window');
    await hand.page.getByLabel('Until').fill('01:00');
    await hand.shoots('room-hours');
    await hand.taps('hours-confirm');
    await hand.at('hours-sheet').waitFor({ state: 'detached' });
    await hand.reads('room', 'Night window 20:00 to 01:00');
    await hand.tapsOn('List', 'radio');
    await hand.taps('start-row');
    await hand.reads('start-state', /Blocked/);
    await hand.sees('the night window of the room is 20:00 to 01:00');
    await hand.shoots('calendar-blocked');
    await hand.taps('sheet-close');
    await hand.taps('change-hours');
    await hand.taps('has-window');
    await hand.taps('hours-confirm');
    await hand.reads('room', 'No night window');
  });

  chapter('a secret address for calendar programs is shown once; the schedule is ended', async () => {
    await hand.taps('make-feed');
    const address = await hand.reads('feed-address', /\/api\/calendars\/.{40,}/);
    const text = await (await hand.context.request.get(address)).text();
    expect(text).toContain('BEGIN:VCALENDAR');
    expect(text).toContain('North bench');
    await hand.taps('end-schedule');
    await hand.taps('end-confirm');
    await hand.at('schedule').waitFor({ state: 'detached' });
    await hand.sees('None. Each start is made by hand.');
    await lab().server.as('keeper', 'DELETE', `/labs/${demoIds.lab}/calendar-feed`).expect(204);
  });

  chapter('a card for the door is printed, and a page hangs there that says when to keep out', async () => {
    await hand.taps('door-card-of');
    await hand.at('door-screen').waitFor();
    await hand.types('door-ring', 'Casimir Thornquist, extension 204');
    await hand.taps('make-door');
    const address = await hand.reads('door-address', /\/doors\/.{40,}/);
    await hand.reads('paper-card', /Do not enter.*extension 204/);
    await hand.shoots('door-screen');
    await hand.context.clearCookies();
    await hand.page.goto(address);
    await hand.reads('door-card', /No measurement is on.*extension 204/);
    await lab().server.arm(20);
    await hand.page.reload();
    await hand.reads('door-card', /Do not enter.*armed.*Until.*extension 204/);
    expect(await hand.page.getByRole('button').count()).toBe(0);
    await hand.shoots('door');
    await lab().server.as('operator', 'DELETE', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/arm`).expect(204);
  });
});
