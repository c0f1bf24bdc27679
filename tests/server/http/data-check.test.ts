import { judgeFlow, type FlowSeen } from '@/server/http/data-check';

const now = Date.UTC(2031, 1, 14, 21);
const min = 60_000;
/** Ten minutes of a device at 10 Hz without a gap. */
const sound: FlowSeen = {
  ...{ name: 'spot', rateHz: 10, device: true, nowUtcMs: now },
  flow: { firstUtcMs: now - 10 * min + 50, lastUtcMs: now - 900, longestGapMs: 100 },
};
const flowing = (flow: Partial<FlowSeen['flow']>, more: Partial<FlowSeen> = {}): FlowSeen => ({
  ...sound,
  ...more,
  flow: { ...sound.flow, ...flow },
});

/** The start check of the design: deflection flowing without a gap for 10 min. */
test.each<[string, FlowSeen, 'pass' | 'note' | 'fail', RegExp]>([
  ['flows', sound, 'pass', /10 min without a gap/],
  ['never came', flowing({ firstUtcMs: null, lastUtcMs: null, longestGapMs: null }), 'fail', /no sample yet/],
  ['is silent', flowing({ lastUtcMs: now - 61_000 }), 'fail', /no sample for 61 s/],
  ['had a gap', flowing({ longestGapMs: 14_000 }), 'fail', /had a gap in the last 10 min. A start waits/],
  ['has just begun', flowing({ firstUtcMs: now - 3 * min }), 'fail', /for 3\smin now; 10 min without a gap/],
  ['of the simulated rig has just begun', flowing({ firstUtcMs: now - 3 * min }, { device: false }), 'note', /for 3\smin/],
  ['is slow and has no gap', flowing({ longestGapMs: 30_000, firstUtcMs: now - 9.5 * min }, { rateHz: 0.1 }), 'pass', /without a gap/],
  ['is slow and has one', flowing({ longestGapMs: 51_000 }, { rateHz: 0.1 }), 'fail', /had a gap/],
])('a channel that %s', (_, seen, state, words) => {
  const outcome = judgeFlow(seen);
  expect(outcome.state).toBe(state);
  expect(outcome.detail).toMatch(words);
});
