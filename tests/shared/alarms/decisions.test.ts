import { alarmCodes, alarmKinds, type AlarmCode } from '@/shared/alarms/catalog';
import { ringingOf } from '@/shared/alarms/ringing';
import { alarmOfHold } from '@/shared/alarms/of-holds';
import { consequencesOf, firstCauseOf, type GroupMember } from '@/shared/alarms/grouping';
import { channelLimitSchema, passesLimit, type ChannelNow } from '@/shared/alarms/limits';
import { answerAt, calleesOf, morningUtcMs, nextCallee, worryUtcMs } from '@/shared/alarms/rings';
import { usualCallSettings } from '@/shared/alarms/settings';

const zone = 'Europe/Zurich';
const at = (iso: string) => Date.parse(iso);

describe('the table of alarms', () => {
  test('each says what it means and what to do, and no consequence leads back to itself', () => {
    const reaches = (code: AlarmCode, seen: AlarmCode[] = []): AlarmCode[] =>
      alarmKinds[code].followsFrom.flatMap((cause) => {
        expect(seen).not.toContain(cause);
        expect(alarmCodes).toContain(cause);
        return [cause as AlarmCode, ...reaches(cause as AlarmCode, [...seen, code])];
      });
    for (const code of alarmCodes) {
      reaches(code);
      for (const words of [alarmKinds[code].cause, alarmKinds[code].consequence, alarmKinds[code].answer])
        expect(words).toMatch(/^[A-Z].*[.?]$/s);
      expect(alarmKinds[code].shelveAtMostMin).toBeLessThanOrEqual(24 * 60);
    }
  });

  test('a person’s own hold is no alarm; grave reasons are those of their name, all others are a run that is held', () => {
    expect(['held-by-person', 'hold-after-dwell', 'stopped-by-person'].map(alarmOfHold)).toEqual([null, null, null]);
    expect(['interlock', 'limit', 'table-slipped', 'link-lost', 'proof-sign', 'whatever'].map(alarmOfHold)).toEqual([
      ...['interlock', 'limit', 'home-edge', 'held', 'proof-failed', 'held'],
    ]);
  });

  test('a first pair that is off asks to come back until half past eleven; nothing else does, and nobody is sent for in the night', () => {
    const early = (code: AlarmCode, clock: string) => answerAt(code, clock).startsWith('It is early enough to come back. ');
    expect(['22:30:00', '23:29:59', '23:30:00', '02:00:00', '11:59:59'].map((clock) => early('proof-failed', clock))).toEqual([
      ...[true, true, false, false, false],
    ]);
    expect(early('interlock', '22:30:00')).toBe(false);
  });

  test('a restarted controller wakes only while over 3 h are left and somebody is near', () => {
    const ringing = (leftH: number | null, someoneNear: boolean) =>
      ringingOf('controller-reset', { leftMs: leftH === null ? null : leftH * 3_600_000, someoneNear });
    expect([ringing(4, true), ringing(4, false), ringing(2, true), ringing(null, true)]).toEqual([
      'always',
      'morning',
      'morning',
      'morning',
    ]);
  });
});

describe('who is rung', () => {
  const member = (userId: string, role = 'operator', doNotRing: { from: string; until: string } | null = null) => ({
    ...{ userId, name: userId, role, doNotRing },
  });
  const night = { from: '22:00', until: '06:00' };
  const members = [member('ott', 'owner'), member('cas', 'keeper', night), member('ilse'), member('tam', 'analyst')];
  const order = {
    ...usualCallSettings,
    order: [
      { userId: 'cas', near: true },
      { userId: 'ilse', near: false },
    ],
  };
  const rungAt = (iso: string, ringing: 'always' | 'allowed' | 'morning', rung: string[] = [], starter: string | null = null) =>
    nextCallee(calleesOf(order, members, starter), { ringing, utcMs: at(iso), timeZone: zone, rung })?.userId ?? null;

  test('whoever started the run first, then the order of the lab, the owners where there is none; nobody twice', () => {
    const ids = (settings: typeof order, starter: string | null) => calleesOf(settings, members, starter).map(({ userId }) => userId);
    expect(ids(order, 'ilse')).toEqual(['ilse', 'cas']);
    expect(ids(order, 'tam')).toEqual(['tam', 'cas', 'ilse']);
    expect(ids(order, null)).toEqual(['cas', 'ilse']);
    expect(ids({ ...order, starterFirst: false }, 'tam')).toEqual(['cas', 'ilse']);
    expect(ids({ ...order, order: [] }, null)).toEqual(['ott']);
    expect(ids({ ...order, order: [{ userId: 'gone', near: false }] }, 'also-gone')).toEqual([]);
  });

  test('hours of "do not ring" are kept, except where it always rings and nobody else is left', () => {
    expect(rungAt('2031-02-14T19:00:00Z', 'allowed')).toBe('cas');
    // 02:00 in Zurich.
    expect(rungAt('2031-02-15T01:00:00Z', 'allowed')).toBe('ilse');
    expect(rungAt('2031-02-15T01:00:00Z', 'allowed', ['ilse'])).toBeNull();
    expect(rungAt('2031-02-15T01:00:00Z', 'always', ['ilse'])).toBe('cas');
    expect(rungAt('2031-02-15T01:00:00Z', 'always', ['ilse', 'cas'])).toBeNull();
    expect(rungAt('2031-02-14T19:00:00Z', 'morning')).toBeNull();
  });

  test('what can wait is told at once by day and at the next morning by night, right across a change of the clocks', () => {
    const told = (iso: string, timeZone = zone) => new Date(morningUtcMs(at(iso), { morningAt: '07:00', timeZone })).toISOString();
    expect(told('2031-02-14T14:03:00Z')).toBe('2031-02-14T14:03:00.000Z');
    expect(told('2031-02-14T21:30:00Z')).toBe('2031-02-15T06:00:00.000Z');
    expect(told('2031-02-15T01:10:00Z')).toBe('2031-02-15T06:00:00.000Z');
    // Clocks go forward on 2031-03-30 and back on 2031-10-26.
    expect(told('2031-03-29T23:30:00Z')).toBe('2031-03-30T05:00:00.000Z');
    expect(told('2031-10-25T22:30:00Z')).toBe('2031-10-26T06:00:00.000Z');
    expect(told('2031-04-05T14:00:00Z', 'Australia/Lord_Howe')).toBe('2031-04-05T20:30:00.000Z');
  });

  test('expected to end 06:52: worry after 07:10', () => {
    expect(new Date(worryUtcMs(at('2031-02-15T05:52:00Z'))).toISOString()).toBe('2031-02-15T06:10:00.000Z');
  });
});

describe('floods', () => {
  const member = (id: string, code: AlarmCode, minute: number, change: Partial<GroupMember> = {}): GroupMember => ({
    ...{ id, code, rigId: 'north', raisedUtcMs: minute * 60_000, causeId: null, standing: true },
    ...change,
  });
  const raised = (id: string, code: AlarmCode, minute: number, rigId = 'north') => ({ id, code, rigId, raisedUtcMs: minute * 60_000 });

  test('a hold goes under what caused it, also by way of another; not on another rig and not long after', () => {
    const supply = member('a', 'supply', 0);
    const reset = member('b', 'controller-reset', 1, { causeId: 'a' });
    expect(firstCauseOf(raised('c', 'held', 2), [reset, supply])).toBe('a');
    expect(firstCauseOf(raised('c', 'held', 2, 'south'), [reset, supply])).toBeNull();
    expect(firstCauseOf(raised('c', 'held', 30), [{ ...supply, standing: false }])).toBeNull();
  });

  test('a cause that is told after its consequence takes it under itself', () => {
    const held = member('a', 'held', 0);
    expect(consequencesOf(raised('b', 'interlock', 1), [held, member('c', 'disk-low', 0)])).toEqual(['a']);
  });

  test('the eleventh in ten minutes goes under the first, but never what always rings', () => {
    const many = Array.from({ length: 10 }, (_, index) => member(`m${String(index)}`, 'channel-level', index / 2));
    expect(firstCauseOf(raised('x', 'channel-slope', 6), many)).toBe('m0');
    expect(firstCauseOf(raised('x', 'channel-slope', 6), many.slice(1))).toBeNull();
    expect(firstCauseOf(raised('x', 'interlock', 6), many)).toBeNull();
  });
});

describe('limits of a channel', () => {
  const now = (value: number | null, change: Partial<ChannelNow> = {}): ChannelNow => ({
    ...{ utcMs: 1_000_000, last: value === null ? null : { utcMs: 999_000, value }, slopePerH: null, span: null, met: false },
    ...change,
  });

  test('level: beyond it, and back only by more than the dead band', () => {
    const limit = channelLimitSchema.parse({ kind: 'level', least: 18, greatest: 22, deadBand: 0.1 });
    expect([21.9, 22.1, 17.9, 18.1].map((value) => passesLimit(limit, now(value)))).toEqual([false, true, true, false]);
    expect([21.7, 21.5, 18.3, 18.5].map((value) => passesLimit(limit, now(value, { met: true })))).toEqual([true, false, true, false]);
    expect(passesLimit(limit, now(null))).toBe(false);
  });

  test('slope to either side, silence by the age of the last sample', () => {
    const slope = channelLimitSchema.parse({ kind: 'slope', greatestPerH: 0.3 });
    const span = channelLimitSchema.parse({ kind: 'span', atMost: 0.5 });
    expect(span).toMatchObject({ windowS: 3600 });
    expect([0.5, 0.51, null].map((each) => passesLimit(span, now(20, { span: each })))).toEqual([false, true, false]);
    expect([0.495, 0.485].map((each) => passesLimit(span, now(20, { span: each, met: true })))).toEqual([true, false]);
    expect(channelLimitSchema.safeParse({ kind: 'span', atMost: -1 }).success).toBe(false);
    expect([0.2, 0.4, -0.4, null].map((slopePerH) => passesLimit(slope, now(20, { slopePerH })))).toEqual([false, true, true, false]);
    const silence = channelLimitSchema.parse({ kind: 'silence', atMostS: 60 });
    expect(passesLimit(silence, now(20))).toBe(false);
    expect(passesLimit(silence, now(20, { last: { utcMs: 900_000, value: 20 } }))).toBe(true);
  });

  test('limits that limit nothing are refused', () => {
    expect(channelLimitSchema.safeParse({ kind: 'level', least: null, greatest: null }).success).toBe(false);
    expect(channelLimitSchema.safeParse({ kind: 'level', least: 5, greatest: 4 }).success).toBe(false);
    expect(channelLimitSchema.safeParse({ kind: 'slope', greatestPerH: 0 }).success).toBe(false);
  });
});
