import { againstRoom, overlap } from '@/shared/schedule/room';
import { openHours, roomHoursSchema, schedulePlanSchema } from '@/shared/schedule/plan';

const at = (iso: string) => Date.parse(iso);
const stay = (from: string, until: string) => ({ startUtcMs: at(from), endUtcMs: at(until) });
/** 21:00 to 07:00 in winter, when Zurich is an hour ahead of UTC. */
const night = { nightWindow: { from: '21:00', until: '07:00' }, blackouts: [] };
const inZurich = (...span: [string, string]) => againstRoom(night, stay(...span), 'Europe/Zurich');

test('a run belongs into one night window, before and after midnight', () => {
  expect(inZurich('2031-02-14T21:00:00Z', '2031-02-15T05:30:00Z')).toBeNull();
  expect(inZurich('2031-02-14T20:00:00Z', '2031-02-15T06:00:00Z')).toBeNull();
  expect(inZurich('2031-02-15T00:00:00Z', '2031-02-15T05:00:00Z')).toBeNull();
  expect(inZurich('2031-02-14T21:00:00Z', '2031-02-15T06:30:00Z')).toBe(
    'It would take from 22:00 to 07:30; the night window of the room is 21:00 to 07:00.',
  );
  expect(inZurich('2031-02-14T19:30:00Z', '2031-02-15T05:00:00Z')).not.toBeNull();
  expect(inZurich('2031-02-14T09:00:00Z', '2031-02-14T11:00:00Z')).not.toBeNull();
  // Ends inside the window of the next night.
  expect(inZurich('2031-02-14T21:00:00Z', '2031-02-15T21:30:00Z')).not.toBeNull();
});

test('the night of a change of the clocks is judged by the clocks on the wall', () => {
  // 22:00 (UTC+1) to 06:59 (UTC+2): one hour shorter than it looks.
  expect(inZurich('2031-03-29T21:00:00Z', '2031-03-30T04:59:00Z')).toBeNull();
  expect(inZurich('2031-03-29T21:00:00Z', '2031-03-30T05:30:00Z')).not.toBeNull();
});

test('where an hour is gone through twice, a stay that begins after the window is not in it for ending at an earlier time of day', () => {
  // From the first 02:30 (UTC+2) to the second 02:10 (UTC+1), the window being over at 02:15.
  const early = { nightWindow: { from: '22:00', until: '02:15' }, blackouts: [] };
  expect(againstRoom(early, stay('2031-10-26T00:30:00Z', '2031-10-26T01:10:00Z'), 'Europe/Zurich')).not.toBeNull();
  expect(againstRoom(early, stay('2031-10-26T00:05:00Z', '2031-10-26T01:10:00Z'), 'Europe/Zurich')).toBeNull();
});

test('a window by day', () => {
  const day = { nightWindow: { from: '08:00', until: '18:00' }, blackouts: [] };
  expect(againstRoom(day, stay('2031-02-14T08:00:00Z', '2031-02-14T16:00:00Z'), 'Europe/Zurich')).toBeNull();
  expect(againstRoom(day, stay('2031-02-14T08:00:00Z', '2031-02-15T08:00:00Z'), 'Europe/Zurich')).not.toBeNull();
});

test('no run begins on a blackout date of the lab or goes on into one, and the reason is said', () => {
  const hours = { ...openHours, blackouts: [{ from: '2031-02-14', until: '2031-02-16', why: 'floor is laid' }] };
  expect(againstRoom(hours, stay('2031-02-16T21:00:00Z', '2031-02-17T05:00:00Z'), 'Europe/Zurich')).toBe(
    '2031-02-16 is a blackout date: floor is laid.',
  );
  // The night before would go on into it; one that is over at midnight, 23:00 by UTC, would not.
  expect(againstRoom(hours, stay('2031-02-13T21:00:00Z', '2031-02-14T05:00:00Z'), 'Europe/Zurich')).toBe(
    'It would go on into 2031-02-14, which is a blackout date: floor is laid.',
  );
  expect(againstRoom(hours, stay('2031-02-13T21:00:00Z', '2031-02-13T23:00:00Z'), 'Europe/Zurich')).toBeNull();
  expect(againstRoom(hours, stay('2031-02-13T21:00:00Z', '2031-02-13T23:00:01Z'), 'Europe/Zurich')).not.toBeNull();
  // A stay of three days has it in its middle.
  expect(againstRoom(hours, stay('2031-02-13T21:00:00Z', '2031-02-17T05:00:00Z'), 'Europe/Zurich')).toContain('2031-02-14');
  // Half past midnight of the 17th in Zurich is still the 16th in UTC.
  expect(againstRoom(hours, stay('2031-02-16T23:30:00Z', '2031-02-17T05:00:00Z'), 'Europe/Zurich')).toBeNull();
});

test('two runs that only touch do not overlap', () => {
  const a = stay('2031-02-14T20:00:00Z', '2031-02-14T22:00:00Z');
  expect(overlap(a, stay('2031-02-14T22:00:00Z', '2031-02-14T23:00:00Z'))).toBe(false);
  expect(overlap(a, stay('2031-02-14T21:59:00Z', '2031-02-14T23:00:00Z'))).toBe(true);
});

test('what is wrong with a plan is said where it is', () => {
  const messages = (result: { success: boolean; error?: { issues: { path: PropertyKey[]; message: string }[] } }) =>
    result.error?.issues.map(({ path, message }) => `${path.join('.')}: ${message}`);
  expect(messages(schedulePlanSchema.safeParse({ kind: 'once', date: '14.2.2031', time: '9 pm' }))).toEqual([
    'date: a day is written YYYY-MM-DD, for example 2031-02-14',
    'time: a time of day is written HH:MM, for example 22:00',
  ]);
  expect(messages(schedulePlanSchema.safeParse({ kind: 'weekly', days: [], time: '22:00', from: '2031-02-14', until: null }))).toEqual([
    'days: choose one day at least',
  ]);
  expect(
    messages(schedulePlanSchema.safeParse({ kind: 'weekly', days: ['mon'], time: '22:00', from: '2031-02-14', until: '2031-02-01' })),
  ).toEqual(['until: the last day lies before the first']);
  expect(
    messages(roomHoursSchema.safeParse({ nightWindow: null, blackouts: [{ from: '2031-02-14', until: '2031-02-14', why: ' ' }] })),
  ).toEqual(['blackouts.0.why: say why']);
});
