import type { ProtocolDocument } from '@/shared/protocol/document';
import { type Bench, makeBench, runStart, shortProtocol, underWay } from './rig-bench';

/** What should not happen and must still end well: nothing moves, and a sentence says why. */

const withSteps = (...steps: ProtocolDocument['steps']): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Unusual',
  steps: [{ kind: 'home' }, ...steps],
});

async function expectFailed(bench: Bench, words: string): Promise<void> {
  await bench.pass(60);
  expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining(words) });
  const { length } = bench.link.motions;
  await bench.pass(600);
  expect(bench.link.motions).toHaveLength(length);
  expect(bench.link.commands.at(-1)?.kind).toBe('stop');
}

test.each([
  [
    'more turns than the cables stand',
    withSteps({ kind: 'rotate', period_s: 1800, turns: 2 }),
    '2.rotate.a: turns 2 winds the cables further than motion.turnsLimit 0',
  ],
  ['a station the rig does not have', withSteps({ kind: 'swing', to: 'atlantis' }), '2.swing: The rig has no station "atlantis"'],
  [
    'a beat without a swing',
    withSteps({ kind: 'dwell', beat_periods: 2 }),
    '2.dwell: A dwell with beat_periods must directly follow a swing',
  ],
  ['more than 10,000 steps', withSteps({ kind: 'repeat', times: 10_001, steps: [{ kind: 'mark', label: 'tick' }] }), 'at most 10000 steps'],
])('a protocol with %s that was never checked fails at that step', async (_, protocol, words) => {
  const bench = makeBench(runStart(protocol));
  bench.driver.start();
  await expectFailed(bench, words);
});

test('a fault in the engine itself fails the run and sends a stop', async () => {
  const bench = await underWay(64);
  // A snapshot that no transition can come from stands for any defect.
  (bench.driver.state().context as { cursor: unknown }).cursor = null;
  await expectFailed(bench, 'a fault of its own');
  expect(bench.store.events.at(-1)).toMatchObject({ kind: 'failed', data: { code: 'defect' } });
});

test('a fault in the loop ends motion, and the next process takes the run up', async () => {
  const bench = await underWay(3, runStart({ ...shortProtocol, onInterruption: 'resume' }));
  const send = bench.link.send.bind(bench.link);
  bench.link.send = (command) => {
    bench.link.send = send;
    throw new Error(`${command.kind} could not be written`);
  };
  await bench.pass(70);
  expect(bench.errors).toEqual([new Error('move could not be written')]);
  expect(bench.driver.isOver()).toBe(true);
  expect(bench.link.commands.at(-1)?.kind).toBe('hold');
  expect(bench.link.mayRenew()).toBe(false);
  await bench.restart(5);
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
});

test('a listener that throws does not disturb the run', async () => {
  const bench = makeBench();
  bench.driver.onChange(() => {
    throw new Error('a screen broke');
  });
  bench.driver.start();
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  expect(bench.errors.length).toBeGreaterThan(5);
});

test('lost supply takes the position with it: held, the arm void, and not to be resumed', async () => {
  const bench = await underWay(30);
  bench.link.loseSupply();
  await bench.pass(5);
  expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('motor supply was lost') });
  expect(bench.driver.facts().mayResume).toEqual({ ok: false, why: 'The motor supply is off; switch it on at the rig.' });
  bench.link.returnSupply();
  await bench.pass(5);
  expect(bench.driver.facts().mayResume.why).toContain('does not know its position');
});

test('resume is refused when the sources no longer stand where the step measures', async () => {
  const bench = await underWay(30);
  bench.driver.hold('Ben');
  await bench.pass(1);
  bench.link.angleDeg = 15;
  bench.link.restore(true);
  await bench.pass(1);
  expect(await bench.driver.resume('Ben')).toEqual({ ok: false, why: expect.stringContaining('stand at 15.00 deg, not at 20.18 deg') });
});

test('two taps on resume at once start the motion once', async () => {
  const bench = await underWay(30);
  bench.driver.hold('Ben');
  await bench.pass(1);
  const answers = [bench.driver.resume('Ben'), bench.driver.resume('Ben')];
  await bench.pass(1);
  expect((await Promise.all(answers)).map(({ ok }) => ok).sort()).toEqual([false, true]);
  expect(bench.store.log().filter(({ kind }) => kind === 'dwell')).toHaveLength(2);
});

test('a motion that ends at a limit holds the run; under stop it is stopped', async () => {
  for (const [onInterruption, state] of [
    ['hold', 'held'],
    ['resume', 'held'],
    ['stop', 'stopped'],
  ] as const) {
    const bench = await underWay(3, runStart({ ...shortProtocol, onInterruption }));
    bench.link.endAt('limit');
    await bench.pass(5);
    expect(bench.driver.facts()).toMatchObject({ state, reason: expect.stringContaining('travel limit') });
  }
});

test('a motion that somebody ends at the rig holds the run under every policy', async () => {
  const bench = await underWay(3, runStart({ ...shortProtocol, onInterruption: 'resume' }));
  bench.link.endAt('stop');
  await bench.pass(5);
  expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('ended at the rig') });
});

test('the arm key and a lapsed lease in a dwell are logged and change nothing', async () => {
  const bench = await underWay(30);
  bench.link.tellArmKey(false);
  bench.link.tellLeaseLapsed();
  await bench.pass(300);
  expect(bench.store.kinds()).toEqual(expect.arrayContaining(['arm-key', 'lease-lapsed']));
  expect(bench.driver.facts().state).toBe('finished');
});

test('a wall clock that is set back does not make a dwell end early', async () => {
  const bench = await underWay(30);
  let shiftMs = 0;
  const utcMs = bench.clock.utcMs.bind(bench.clock);
  bench.clock.utcMs = () => utcMs() + shiftMs;
  shiftMs = -20_000;
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  const dwell = bench.store.log()[2];
  expect((dwell?.endUtcMs ?? 0) - (dwell?.startUtcMs ?? 0)).toBeCloseTo(60_000, 3);
});
