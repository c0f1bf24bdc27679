import { verifyChain } from '@/shared/archive/chain';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { planTimeline } from '@/shared/protocol/timeline';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { type Bench, runStart, sha256, startUtcMs, underWay } from './rig-bench';

/** Home, near, a kick with a ring-down of one period, then shaped swings to far and back at a beat of two periods. */
const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Parts',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'kick', amplitude_urad: 2000, periods: 1 },
    { kind: 'swing', to: 'far', profile: 'shaped' },
    { kind: 'dwell', beat_periods: 2 },
    { kind: 'swing', to: 'near', profile: 'shaped' },
    { kind: 'dwell', beat_periods: 2 },
  ],
};
const plan = planTimeline({ protocol, rig: demoRigWide, timeZone: 'UTC' }, { utcMs: startUtcMs, angleDeg: 0 });
const secondsTo = (path: string, part: string) => {
  const item = plan.items.find((each) => (each.path === path || each.path.startsWith(`${path} pause`)) && (each.part ?? '') === part);
  if (item === undefined) throw new Error(`no ${part} at ${path}`);
  return { from: (item.startUtcMs - startUtcMs) / 1000, to: (item.endUtcMs - startUtcMs) / 1000 };
};
const rows = (bench: Bench) => bench.store.log().map(({ path, outcome }) => `${path} ${outcome}`);
const row = (bench: Bench, path: string) => {
  const found = bench.store.log().findLast((each) => each.path === path);
  if (found === undefined) throw new Error(`no row ${path}`);
  return found;
};
const whole = [
  '1.home done',
  '2.swing done',
  '3.kick.a done',
  '3.kick.b done',
  '3.kick done',
  '4.swing.a done',
  '4.swing.b done',
  '5.dwell done',
  '6.swing.a done',
  '6.swing.b done',
  '7.dwell done',
];
const T = 420_000;
/** In the pause of the first shaped swing, well before its end. */
const pause = secondsTo('4.swing', 'pause');
const inPause = pause.from + 60;
const runOn = (policy: ProtocolDocument['onInterruption'] = 'hold', seconds = inPause) =>
  underWay(seconds, runStart({ ...protocol, onInterruption: policy }));

test('each move of a kick and of a shaped swing is a row, the ring-down one more, and every later move is timed', async () => {
  const bench = await runOn('hold', 4000);
  expect(bench.driver.facts().state).toBe('finished');
  expect(rows(bench)).toEqual(whole);
  expect(row(bench, '3.kick')).toMatchObject({ kind: 'ring-down', station: 'near', good: null });
  const [a, b, dwell] = [row(bench, '4.swing.a'), row(bench, '4.swing.b'), row(bench, '5.dwell')];
  expect(a).toMatchObject({ kind: 'swing', station: '' });
  expect(b).toMatchObject({ kind: 'swing', station: 'far' });
  // The controller was asked for exactly that instant: pauses are kept to its own clock.
  expect(b.startUtcMs - a.startUtcMs).toBeCloseTo(1000 * (pause.to - secondsTo('4.swing.a', 'move').from), 0);
  expect((dwell.endUtcMs ?? 0) - a.startUtcMs).toBeCloseTo(2 * T, 0);
  expect(bench.driver.facts().predictedEndUtcMs).toBe(row(bench, '7.dwell').endUtcMs);
});

test('a hold between the moves moves nothing; resumed in time the second move keeps its instant', async () => {
  const bench = await runOn();
  const moved = bench.link.motions.length;
  bench.driver.hold('Ben');
  await bench.pass(30);
  expect(bench.driver.facts().state).toBe('held');
  expect(bench.link.motions).toHaveLength(moved);
  expect((await bench.driver.resume('Cleo')).ok).toBe(true);
  await bench.pass(3000);
  expect(rows(bench)).toEqual(whole);
  expect(row(bench, '4.swing.b').startUtcMs - row(bench, '4.swing.a').startUtcMs).toBeCloseTo(
    1000 * (pause.to - secondsTo('4.swing.a', 'move').from),
    0,
  );
});

test('resumed too late the second move is made at once, says so, and its dwell has its whole length', async () => {
  const bench = await runOn();
  bench.driver.hold('Ben');
  await bench.pass(600);
  await bench.driver.resume('Cleo');
  await bench.pass(3000);
  expect(rows(bench)).toEqual(whole.map((each) => each.replace('4.swing.b done', '4.swing.b late')));
  const dwell = row(bench, '5.dwell');
  expect((dwell.endUtcMs ?? 0) - dwell.startUtcMs).toBeCloseTo(
    (row(bench, '7.dwell').endUtcMs ?? 0) - row(bench, '7.dwell').startUtcMs,
    -2,
  );
});

test.each([
  ['hold', 'held'],
  ['resume', 'finished'],
  ['stop', 'stopped'],
] as const)('a link or a server that is gone between the moves, or while the second waits, under %s: %s', async (policy, state) => {
  for (const seconds of [inPause, pause.to - 0.8, pause.to + 2])
    for (const fault of [(bench: Bench) => bench.restart(5), async (bench: Bench) => bench.link.drop(30_000)]) {
      const bench = await runOn(policy, seconds);
      await fault(bench);
      await bench.pass(4000);
      expect(bench.driver.facts().state).toBe(state);
      expect(bench.store.log().filter(({ outcome }) => outcome === null)).toEqual([]);
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
      expect(new Set(bench.link.motions.map(({ commandId }) => commandId)).size).toBe(bench.link.motions.length);
      if (state === 'finished') expect(bench.link.angleDeg).toBeCloseTo(20.18, 1);
    }
});

test('an interlock or a reset between the moves holds, and the waiting move is never made', async () => {
  for (const disturb of [(bench: Bench) => bench.link.openInterlock(), (bench: Bench) => bench.link.reset()]) {
    const bench = await runOn('resume');
    const moved = bench.link.motions.length;
    disturb(bench);
    await bench.pass(600);
    expect(bench.driver.facts().state).toBe('held');
    expect(bench.link.motions).toHaveLength(moved);
  }
});

test('hold after this dwell, asked between the moves or while the second waits, lets the swing end', async () => {
  for (const seconds of [inPause, pause.to - 0.8]) {
    const bench = await runOn('hold', seconds);
    await bench.driver.holdAfterDwell('Ben');
    await bench.pass(600);
    expect(bench.driver.facts().state).toBe('held');
    expect(rows(bench).at(-1)).toBe('4.swing.b done');
  }
});

test('what stands between two moves is no step to be left out, and the run says what it is in', async () => {
  const bench = await runOn();
  expect(bench.driver.facts().maySkip).toMatchObject({ ok: false, why: expect.stringContaining('between two moves') });
  expect(bench.driver.facts().current).toMatchObject({ path: '4.swing', kind: 'swing' });
  // Homing from the very edge takes the bench's controller no time, and the plan 1.6 s.
  expect(Math.abs((bench.driver.facts().predictedEndUtcMs ?? 0) - plan.endUtcMs)).toBeLessThan(2000);
});
