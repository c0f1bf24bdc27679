import * as fc from 'fast-check';
import { Temporal } from 'temporal-polyfill';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { weekdays, type SchedulePlan } from '@/shared/schedule/plan';

/**
 * Local times against an independent reckoning: the TC39 Temporal proposal (its polyfill), which looks each day up in the IANA
 * data, where the product steps with a cron library. Lord Howe changes its clocks by 30 minutes, Apia left out a whole day in 2011.
 */
const zones = [
  'Europe/Zurich',
  'Europe/London',
  'America/New_York',
  'America/St_Johns',
  'Australia/Lord_Howe',
  'Pacific/Auckland',
  'Asia/Tehran',
  'Africa/Casablanca',
];

const utcMs = (iso: string) => Date.parse(iso);
const iso = (ms: number) => new Date(ms).toISOString();
const startsOf = (plan: SchedulePlan, zone: string, from: string, until: string) =>
  occurrencesBetween(plan, zone, { afterUtcMs: utcMs(from), untilUtcMs: utcMs(until) });

/** Day by day: the first instant of the time of day, or where it is left out the instant of the change. */
function oracle(
  plan: SchedulePlan & { kind: 'weekly' },
  timeZone: string,
  { fromMs, untilMs }: { fromMs: number; untilMs: number },
): number[] {
  const found: number[] = [];
  const time = Temporal.PlainTime.from(plan.time);
  let day = Temporal.Instant.fromEpochMilliseconds(fromMs).toZonedDateTimeISO(timeZone).toPlainDate().subtract({ days: 1 });
  for (let days = 0; days < 400; days += 1, day = day.add({ days: 1 })) {
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

test('recurring starts are those of an independent calendar in eight zones, across all changes of the clocks', () => {
  const twoDigits = (most: number) => fc.integer({ min: 0, max: most }).map((n) => String(n).padStart(2, '0'));
  // Half of all times lie in the hours in which clocks are changed.
  const hours = fc.oneof(twoDigits(23), fc.constantFrom('00', '01', '02', '03'));
  fc.assert(
    fc.property(
      fc.constantFrom(...zones),
      fc.record({ hour: hours, minute: twoDigits(59) }),
      fc.uniqueArray(fc.constantFrom(...weekdays), { minLength: 1 }),
      fc.integer({ min: 0, max: 300 }),
      (zone, { hour, minute }, days, startDay) => {
        const fromMs = Date.UTC(2030, 0, 1) + startDay * 86_400_000;
        const untilMs = fromMs + 300 * 86_400_000;
        const plan = { kind: 'weekly', days, time: `${hour}:${minute}`, from: '2030-01-01', until: null } as const;
        const found = occurrencesBetween({ ...plan, days: [...days] }, zone, { afterUtcMs: fromMs, untilUtcMs: untilMs });
        expect(found.map(({ dueUtcMs }) => iso(dueUtcMs))).toEqual(
          oracle({ ...plan, days: [...days] }, zone, { fromMs, untilMs }).map(iso),
        );
      },
    ),
    { numRuns: 24, seed: 11 },
  );
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
