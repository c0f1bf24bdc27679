import { judgeFlow, type Flow } from '@/server/http/data-check';

const now = Date.UTC(2031, 1, 14, 21);
const min = 60_000;
/** Ten minutes at 10 Hz without a gap. */
const sound: Flow = {
  name: 'deflection',
  rateHz: 10,
  count: 6000,
  nowUtcMs: now,
  fromUtcMs: now - 10 * min,
  firstUtcMs: now - 10 * min + 50,
  lastUtcMs: now - 900,
  gapS: 0.1,
  gapUtcMs: now - 5 * min,
  timeZone: 'UTC',
};

/** The start check of the design: deflection flowing without a gap for 10 min. */
test.each<[string, Partial<Flow>, 'pass' | 'fail', RegExp]>([
  ['flows', {}, 'pass', /without a gap for 10 min/],
  ['never came', { count: 0, firstUtcMs: null, lastUtcMs: null, gapS: 0, gapUtcMs: null }, 'fail', /no sample for 10 min/],
  ['is silent', { lastUtcMs: now - 61_000 }, 'fail', /no sample for 61 s/],
  ['had a gap', { gapS: 14, gapUtcMs: now - 4 * min }, 'fail', /gap of 14 s from 20:56, UTC on\. Wait until 21:06, UTC/],
  ['has just begun', { firstUtcMs: now - 3 * min }, 'fail', /since 20:57, UTC only\. Wait until 21:07, UTC/],
  ['is slow and has no gap', { rateHz: 0.1, gapS: 30, firstUtcMs: now - 9.5 * min }, 'pass', /without a gap/],
  ['is slow and has one', { rateHz: 0.1, gapS: 51 }, 'fail', /gap of 51 s/],
  ['has flowed as long as the simulated pendulum swings', { fromUtcMs: now - 20_000, firstUtcMs: now - 19_900 }, 'pass', /for 20 s/],
])('a channel that %s', (_, change, state, words) => {
  const outcome = judgeFlow({ ...sound, ...change });
  expect(outcome.state).toBe(state);
  expect(outcome.detail).toMatch(words);
});
