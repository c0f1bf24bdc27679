import { tryPlan } from '@/scripts/soak/clock/try-plan';
import { tryRule } from '@/scripts/soak/clock/try-rule';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { weekdays, type SchedulePlan } from '@/shared/schedule/plan';

/** Beside an independent reckoning: more of it by `npm run soak -- r9`. */

const utcMs = (iso: string) => Date.parse(iso);
const iso = (ms: number) => new Date(ms).toISOString();
const startsOf = (plan: SchedulePlan, zone: string, from: string, until: string) =>
  occurrencesBetween(plan, zone, { afterUtcMs: utcMs(from), untilUtcMs: utcMs(until) });

test('the recurring starts of a year are those of an independent calendar in eight zones, across all changes of the clocks', async () => {
  expect(await tryFirst(24, tryRule)).toEqual([]);
});

test('plans of every kind, with a night window and blackout dates, start when an independent calendar says, and only when the room is free', async () => {
  expect(await tryFirst(80, tryPlan)).toEqual([]);
});

test('a time that the spring change leaves out is the moment of the change, and said', () => {
  const plan: SchedulePlan = { kind: 'weekly', days: [...weekdays], time: '02:30', from: '2031-01-01', until: null };
  expect(startsOf(plan, 'Europe/Zurich', '2031-03-29T12:00:00Z', '2031-03-31T12:00:00Z')).toEqual([
    { dueUtcMs: utcMs('2031-03-30T01:00:00Z'), remark: 'The clocks change: 02:30 does not exist on this day. It starts at 03:00.' },
    { dueUtcMs: utcMs('2031-03-31T00:30:00Z'), remark: null },
  ]);
});

test('of a time that comes twice in autumn the first is meant, once, and said', () => {
  const plan: SchedulePlan = { kind: 'weekly', days: [...weekdays], time: '02:30', from: '2031-01-01', until: null };
  expect(startsOf(plan, 'Europe/Zurich', '2031-10-25T12:00:00Z', '2031-10-27T12:00:00Z')).toEqual([
    { dueUtcMs: utcMs('2031-10-26T00:30:00Z'), remark: 'The clocks change: 02:30 comes twice on this day. It starts at the first.' },
    { dueUtcMs: utcMs('2031-10-27T01:30:00Z'), remark: null },
  ]);
});

test('a change of half an hour', () => {
  const plan: SchedulePlan = { kind: 'weekly', days: [...weekdays], time: '02:15', from: '2026-01-01', until: null };
  const [first] = startsOf(plan, 'Australia/Lord_Howe', '2026-10-03T12:00:00Z', '2026-10-04T12:00:00Z');
  // 02:00 to 02:30 is left out on 4 October 2026 (IANA time zone data).
  expect(iso(first?.dueUtcMs ?? 0)).toBe('2026-10-03T15:30:00.000Z');
});

test('once is once', () => {
  const plan: SchedulePlan = { kind: 'once', date: '2031-02-14', time: '22:00' };
  expect(startsOf(plan, 'Europe/Zurich', '2031-01-01T00:00:00Z', '2032-01-01T00:00:00Z')).toEqual([
    { dueUtcMs: utcMs('2031-02-14T21:00:00Z'), remark: null },
  ]);
  expect(startsOf(plan, 'Europe/Zurich', '2031-02-14T21:00:00Z', '2032-01-01T00:00:00Z')).toEqual([]);
});

test('once on the night of the change', () => {
  const at = (time: string, date: string) =>
    startsOf({ kind: 'once', date, time }, 'Europe/Zurich', '2031-01-01T00:00:00Z', '2032-01-01T00:00:00Z');
  expect(at('02:30', '2031-03-30').map(({ dueUtcMs }) => iso(dueUtcMs))).toEqual(['2031-03-30T01:00:00.000Z']);
  expect(at('02:30', '2031-10-26').map(({ dueUtcMs }) => iso(dueUtcMs))).toEqual(['2031-10-26T00:30:00.000Z']);
});

test('begins and ends with its first and last day', () => {
  const plan: SchedulePlan = { kind: 'weekly', days: ['mon', 'thu'], time: '22:00', from: '2031-02-11', until: '2031-02-20' };
  expect(
    startsOf(plan, 'Europe/Zurich', '2031-02-01T00:00:00Z', '2031-04-01T00:00:00Z').map(({ dueUtcMs }) => iso(dueUtcMs).slice(0, 10)),
  ).toEqual(['2031-02-13', '2031-02-17', '2031-02-20']);
});
