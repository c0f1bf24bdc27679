import { nextOccurrenceUtcMs, waitUntilLocalTime } from '@/shared/protocol/local-time';

const at = (iso: string) => Date.parse(iso);
const iso = (utcMs: number) => new Date(utcMs).toISOString().replace('.000Z', 'Z');

describe('wait until a local time means the nearest occurrence', () => {
  const wait = (
    now: string,
    localTime: string,
    { ifPast = 'continue', timeZone = 'UTC' }: { ifPast?: 'continue' | 'hold' | 'next day'; timeZone?: string } = {},
  ) => {
    const { endUtcMs, past } = waitUntilLocalTime({ localTime, timeZone, utcMs: at(now), ifPast });
    return { end: iso(endUtcMs), past };
  };

  test('a time later today is waited for', () => {
    expect(wait('2031-03-13T18:00:00Z', '22:00')).toEqual({ end: '2031-03-13T22:00:00Z', past: false });
  });

  test('a time early tomorrow is waited for', () => {
    expect(wait('2031-03-13T22:00:00Z', '06:30')).toEqual({ end: '2031-03-14T06:30:00Z', past: false });
  });

  test('a time up to 12 h back is past, and the protocol goes on at once', () => {
    expect(wait('2031-03-13T23:10:00Z', '22:00')).toEqual({ end: '2031-03-13T23:10:00Z', past: true });
    expect(wait('2031-03-14T09:00:00Z', '22:00')).toEqual({ end: '2031-03-14T09:00:00Z', past: true });
    expect(wait('2031-03-14T10:00:00Z', '22:00')).toEqual({ end: '2031-03-14T10:00:00Z', past: true });
    expect(wait('2031-03-14T10:01:00Z', '22:00')).toEqual({ end: '2031-03-14T22:00:00Z', past: false });
  });

  test('the very moment is neither past nor waited for', () => {
    expect(wait('2031-03-13T22:00:00Z', '22:00', { ifPast: 'hold' })).toEqual({ end: '2031-03-13T22:00:00Z', past: false });
  });

  test('next day waits for the occurrence after the one that is past', () => {
    expect(wait('2031-03-13T23:10:00Z', '22:00', { ifPast: 'next day' })).toEqual({ end: '2031-03-14T22:00:00Z', past: true });
    expect(wait('2031-03-14T02:00:00Z', '22:00', { ifPast: 'next day' })).toEqual({ end: '2031-03-14T22:00:00Z', past: true });
  });

  test('the time is that of the zone', () => {
    expect(wait('2031-01-13T18:00:00Z', '22:00', { timeZone: 'Asia/Kathmandu' })).toEqual({ end: '2031-01-13T18:00:00Z', past: true });
    expect(wait('2031-01-13T18:00:00Z', '22:00', { timeZone: 'Europe/Oslo' })).toEqual({ end: '2031-01-13T21:00:00Z', past: false });
  });
});

describe('changes of the clocks (Europe: 2031-03-30 at 01:00 UTC forwards, 2031-10-26 at 01:00 UTC back)', () => {
  const next = (now: string, localTime: string) => iso(nextOccurrenceUtcMs({ localTime, timeZone: 'Europe/Oslo', utcMs: at(now) }));

  test('06:30 comes an hour sooner after the change to summer time', () => {
    expect(next('2031-03-29T21:00:00Z', '06:30')).toBe('2031-03-30T04:30:00Z');
    expect(next('2031-03-28T21:00:00Z', '06:30')).toBe('2031-03-29T05:30:00Z');
  });

  test('06:30 comes an hour later after the change back', () => {
    expect(next('2031-10-25T20:00:00Z', '06:30')).toBe('2031-10-26T05:30:00Z');
  });

  test('a time that is left out is the one an hour later', () => {
    expect(next('2031-03-29T21:00:00Z', '02:30')).toBe('2031-03-30T01:30:00Z');
  });

  test('of a time that comes twice the first is meant, and after it the next day', () => {
    expect(next('2031-10-25T20:00:00Z', '02:30')).toBe('2031-10-26T00:30:00Z');
    expect(next('2031-10-26T00:30:00Z', '02:30')).toBe('2031-10-27T01:30:00Z');
  });
});

test('the first occurrence after the moment is strictly after it', () => {
  const next = (now: string) => iso(nextOccurrenceUtcMs({ localTime: '06:30', timeZone: 'UTC', utcMs: at(now) }));
  expect(next('2031-03-14T06:29:59Z')).toBe('2031-03-14T06:30:00Z');
  expect(next('2031-03-14T06:30:00Z')).toBe('2031-03-15T06:30:00Z');
});
