import { verifyChain } from '@/shared/archive/chain';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { checkAtStart } from '@/server/engine/check-at-start';
import { resumePlan } from '@/server/engine/remaining-plan';
import { type Bench, makeBench, runStart, sha256, startUtcMs, underWay } from './rig-bench';

/** A rig whose cables stand three turns, and a run with two turns of 90 s from near: out 182 s, back 123 s. */
const rig: RigDocument = { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), turnsLimit: 3 } };
const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Turning',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 30 },
    { kind: 'rotate', period_s: 90, turns: 2 },
    { kind: 'dwell', for_s: 60 },
  ],
};
const nearDeg = 20.18;
const endDeg = nearDeg + 720;
/** Seconds after the start: in the way out, at its end, in the way back. */
const [out, atEnd, back] = [100, 218.2, 300];
const start = (onInterruption: ProtocolDocument['onInterruption'] = 'hold') => runStart({ ...protocol, onInterruption }, { rig });
const runOn = (seconds: number, policy?: ProtocolDocument['onInterruption']) => underWay(seconds, start(policy));
const rows = (bench: Bench) => bench.store.log().map(({ path, outcome }) => `${path} ${outcome}`);
const row = (bench: Bench, path: string) => {
  const found = bench.store.log().findLast((each) => each.path === path);
  if (found === undefined) throw new Error(`no row ${path}`);
  return found;
};
const eventOf = (bench: Bench, kind: string) => bench.store.events.findLast((event) => event.kind === kind)?.data;
const whole = ['1.home done', '2.swing done', '3.dwell done', '4.rotate.a done', '4.rotate.b done', '5.dwell done'];

test('a rotation begins at the end of the dwell, turns out at its rate, turns back at once, and is two rows', async () => {
  const bench = await runOn(600);
  expect(bench.driver.facts().state).toBe('finished');
  expect(rows(bench)).toEqual(whole);
  const [dwell, way, wayBack] = [row(bench, '3.dwell'), row(bench, '4.rotate.a'), row(bench, '4.rotate.b')];
  expect(way).toMatchObject({ kind: 'rotate', station: '', angleStartDeg: nearDeg, angleEndDeg: endDeg });
  expect(wayBack).toMatchObject({ kind: 'rotate', station: 'near', angleStartDeg: endDeg, angleEndDeg: nearDeg });
  expect(way.startUtcMs).toBeCloseTo(dwell.endUtcMs ?? 0, 0);
  // Two turns of 90 s, and 2 s for the ramps of 4 deg/s at 2 deg/s².
  expect(((way.endUtcMs ?? 0) - way.startUtcMs) / 1000).toBeCloseTo(182, 1);
  expect(((wayBack.endUtcMs ?? 0) - wayBack.startUtcMs) / 1000).toBeCloseTo(123, 1);
  expect(wayBack.startUtcMs - (way.endUtcMs ?? 0)).toBeLessThan(50);
  expect(row(bench, '5.dwell')).toMatchObject({ station: 'near', outcome: 'done' });
});

test.each([
  ['on the way out', out, '4.rotate.a'],
  ['on the way back', back, '4.rotate.b'],
] as const)('held %s it stays where it is, says how far out, and resumed goes on and turns back', async (_when, seconds, path) => {
  const bench = await runOn(seconds);
  bench.driver.hold('Ben');
  await bench.pass(3600);
  const heldDeg = bench.link.angleDeg ?? 0;
  const { state, reason, mayResume } = bench.driver.facts();
  expect({ state, mayResume }).toEqual({ state: 'held', mayResume: { ok: true, why: '' } });
  expect(reason).toContain(
    `${((heldDeg - nearDeg) / 360).toFixed(2)} turns from where the rotation began. Resumed, it goes on and turns back`,
  );
  expect(eventOf(bench, 'rotation-broken-off')).toMatchObject({ beganDeg: nearDeg, angleDeg: heldDeg });
  expect(row(bench, path)).toMatchObject({ outcome: 'cut short', station: '', angleEndDeg: heldDeg });
  const plan = resumePlan(bench.start, bench.driver.state(), bench.clock.utcMs());
  expect(plan).toMatchObject({ firstMotion: { kind: 'rotate' }, turnsBack: path === '4.rotate.b' });

  expect((await bench.driver.resume('Cleo')).ok).toBe(true);
  await bench.pass(1000);
  expect(bench.driver.facts().state).toBe('finished');
  expect(rows(bench).filter((each) => each.startsWith(path))).toEqual([`${path} cut short`, `${path} late`]);
  expect(bench.link.angleDeg).toBeCloseTo(nearDeg, 9);
  // What was left of the turn, not the whole of it again.
  expect(Math.abs((plan?.finishUtcMs ?? 0) - (row(bench, '5.dwell').endUtcMs ?? 0))).toBeLessThan(2000);
});

test('stopped on the way out it is never turned back; the run says what to do, and no run starts until a person has done it', async () => {
  const bench = await runOn(out);
  bench.driver.stop('Ben');
  await bench.pass(3600);
  const angleDeg = bench.link.angleDeg ?? 0;
  expect(angleDeg).toBeGreaterThan(nearDeg + 180);
  expect(bench.driver.facts()).toMatchObject({
    state: 'stopped',
    reason: expect.stringMatching(/^Ben stopped the run\. The sources stand at .* turns from where .* nudges .* before the next run\.$/),
  });
  const seen = (atDeg: number | null) => ({ controller: { positionKnown: atDeg !== null, angleDeg: atDeg }, limits: null });
  const swings: ProtocolDocument = { ...protocol, steps: protocol.steps.slice(0, 3) };
  const refusals = (atDeg: number | null) => checkAtStart({ protocol: swings, rig, timeZone: 'UTC' }, seen(atDeg), startUtcMs);
  expect(refusals(angleDeg)).toMatchObject([{ code: 'wound-up', message: expect.stringContaining('turn the table back') }]);
  expect(refusals(nearDeg)).toEqual([]);
  expect(refusals(null)).toMatchObject([{ code: 'home-refused', path: '1.home', message: expect.stringContaining('cables wound up') }]);
});

test.each([
  ['hold', 'held'],
  ['resume', 'held'],
  ['stop', 'stopped'],
] as const)('a controller that resets in mid-turn under %s: %s, for good; nobody turns back what nobody counts', async (policy, state) => {
  for (const seconds of [out, back]) {
    const bench = await runOn(seconds, policy);
    const moved = bench.link.motions.length;
    bench.link.reset();
    await bench.pass(3600);
    expect(bench.driver.facts()).toMatchObject({ state, reason: expect.stringContaining('its cables may be wound up') });
    expect(bench.driver.facts().mayResume.ok).toBe(false);
    if (state === 'held') {
      expect(bench.driver.facts().mayResume.why).toContain('turn the table back by nudges');
      expect((await bench.driver.resume('Cleo')).ok).toBe(false);
      await bench.pass(600);
    }
    expect(bench.link.motions).toHaveLength(moved);
    expect(bench.store.log().filter(({ outcome }) => outcome === null)).toEqual([]);
  }
});

test.each([
  ['hold', 'held'],
  ['resume', 'finished'],
  ['stop', 'stopped'],
] as const)('a link or a server that is gone in a rotation, at its turning point too, under %s: %s', async (policy, state) => {
  for (const seconds of [36.2, out, atEnd - 1, atEnd, atEnd + 1, back])
    for (const fault of [(bench: Bench) => bench.restart(5), async (bench: Bench) => bench.link.drop(30_000)]) {
      const bench = await runOn(seconds, policy);
      await fault(bench);
      await bench.pass(2000);
      expect({ seconds, state: bench.driver.facts().state }).toEqual({ seconds, state });
      expect(bench.store.log().filter(({ outcome }) => outcome === null)).toEqual([]);
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
      expect(new Set(bench.link.motions.map(({ commandId }) => commandId)).size).toBe(bench.link.motions.length);
      if (state === 'finished') expect(bench.link.angleDeg).toBeCloseTo(nearDeg, 9);
      if (state !== 'held') continue;
      expect((await bench.driver.resume('Cleo')).ok).toBe(true);
      await bench.pass(2000);
      expect(bench.driver.facts().state).toBe('finished');
      expect(bench.link.angleDeg).toBeCloseTo(nearDeg, 9);
    }
});

test.each([
  ['hold', 'held'],
  ['resume', 'finished'],
  ['stop', 'stopped'],
] as const)('a server that dies at any of its writes, before or after it, under %s: %s, and the log is whole', async (policy, state) => {
  for (const point of ['away', 'none'] as const)
    for (let n = 2; n < 40; n += 1) {
      const bench = makeBench(start(policy));
      let writes = 0;
      let died = false;
      bench.store.fault = () => {
        writes += 1;
        if (writes !== n || died) return 'none';
        died = true;
        bench.driver.close();
        return point;
      };
      bench.driver.start();
      await bench.pass(600, () => died);
      if (!died) break;
      await bench.restart(5);
      await bench.pass(2000);
      const ended = bench.store.kinds().includes('finished') ? 'finished' : state;
      expect({ n, state: bench.driver.facts().state }).toEqual({ n, state: ended });
      expect(new Set(bench.link.motions.map(({ commandId }) => commandId)).size).toBe(bench.link.motions.length);
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
      if (ended === 'finished') expect(bench.link.angleDeg).toBeCloseTo(nearDeg, 9);
    }
});

test('an interlock that opens holds it, and the way back is made when a person resumes', async () => {
  const bench = await runOn(out, 'resume');
  bench.link.openInterlock();
  await bench.pass(600);
  expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('The interlock was opened.') });
  bench.link.closeInterlock();
  await bench.pass(1);
  expect((await bench.driver.resume('Cleo')).ok).toBe(true);
  await bench.pass(1000);
  expect(bench.driver.facts().state).toBe('finished');
});

test('hold after this step, asked on the way out, lets it turn back first; a rotation is not left out', async () => {
  const bench = await runOn(out);
  expect(bench.driver.facts().maySkip.ok).toBe(false);
  await bench.driver.holdAfterDwell('Ben');
  await bench.pass(600);
  expect(bench.driver.facts().state).toBe('held');
  expect(rows(bench).at(-1)).toBe('4.rotate.b done');
  expect(bench.link.angleDeg).toBeCloseTo(nearDeg, 9);
});

describe('the home flag of a table that turns', () => {
  const stepDeg = 360 / 16_000;

  test('proves the count in every turn; its other end, half a turn on, proves nothing', async () => {
    const bench = await runOn(out);
    bench.link.edge(180, 'cw');
    bench.link.edge(360, 'ccw');
    await bench.pass(1);
    expect(eventOf(bench, 'flag-end')).toEqual({ angleDeg: 180, direction: 'cw' });
    expect(eventOf(bench, 'home-edge')).toMatchObject({ angleDeg: 360, offDeg: 0, slipSteps: 0, proved: true });
    expect(bench.driver.facts().state).toBe('running');
  });

  test('tells of a slip, and the run holds where it is', async () => {
    const bench = await runOn(out);
    bench.link.edge(360 + 40 * stepDeg, 'ccw');
    await bench.pass(600);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('The table slipped by 40 microsteps') });
    expect(bench.driver.facts().mayResume.ok).toBe(false);
  });
});

test('homing on such a rig takes no longer than planned: a flag that never changes must not wind the cables up', async () => {
  const bench = makeBench(start());
  bench.link.deaf = true;
  bench.driver.start();
  await bench.pass(30);
  expect(bench.driver.facts().state).toBe('failed');
  expect(bench.link.commands.at(-1)?.kind).toBe('stop');
});

test('a start is refused where the controller keeps its own limits closer than the rotation, and says which belong there', () => {
  const limits = (leastDeg: number, greatestDeg: number) => ({
    leastDeg,
    greatestDeg,
    maxSpeedDegS: 6,
    maxAccelerationDegS2: 2,
    homeSpeedDegS: 0.6,
  });
  const refusals = (own: ReturnType<typeof limits> | null) =>
    checkAtStart({ protocol, rig, timeZone: 'UTC' }, { controller: { positionKnown: true, angleDeg: 0 }, limits: own }, startUtcMs);
  expect(refusals(limits(-1255, 1255))).toEqual([]);
  expect(refusals(limits(-175, endDeg))).toEqual([]);
  expect(refusals(limits(-175, 175))).toMatchObject([
    {
      code: 'controller-limits',
      path: '4.rotate',
      message: expect.stringMatching(
        /turns from 20\.18° to 740\.18°, but the controller keeps within −175° to 175°.*\(−1255° to 1255° with its turns\)/,
      ),
    },
  ]);
  expect(refusals(null)).toMatchObject([{ code: 'controller-limits', path: '4.rotate' }]);
});
