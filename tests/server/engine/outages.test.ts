import { verifyChain } from '@/shared/archive/chain';
import { makeBench, runStart, sent, sha256, shortProtocol, underWay } from './rig-bench';

describe('the database', () => {
  test('an outage of 3 s goes by unnoticed', async () => {
    const bench = await underWay(60);
    const from = bench.clock.utcMs();
    bench.store.fault = () => (bench.clock.utcMs() < from + 8000 && bench.clock.utcMs() >= from + 5000 ? 'away' : 'none');
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.store.kinds()).not.toContain('database-away');
  });

  test.each([
    ['hold', 'held'],
    ['resume', 'finished'],
    ['stop', 'stopped'],
  ] as const)('an outage of 20 s in a swing brings it to rest at once; under %s the run is then %s', async (onInterruption, state) => {
    const bench = await underWay(60, runStart({ ...shortProtocol, onInterruption }));
    let backUtcMs = 0;
    bench.store.fault = (write) => {
      const moving = (write.snapshot as { state: string }).state === 'moving';
      if (backUtcMs === 0 && moving) backUtcMs = bench.clock.utcMs() + 20_000;
      return bench.clock.utcMs() < backUtcMs ? 'away' : 'none';
    };
    await bench.pass(12);
    expect(bench.driver.facts().reason).toContain('database is away');
    expect(sent(bench, 'hold')).toHaveLength(1);
    expect(bench.link.mayRenew()).toBe(false);
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe(state);
    expect(bench.store.kinds()).toContain('database-away');
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
  });

  test('stop works while it is away', async () => {
    const bench = await underWay(67);
    bench.store.fault = () => 'away';
    await bench.pass(3);
    bench.driver.stop('Ben');
    expect(sent(bench, 'stop')).toHaveLength(1);
    await bench.pass(10);
    const stoodAt = bench.link.nowDeg();
    await bench.pass(60);
    expect(bench.link.nowDeg()).toBe(stoodAt);
    bench.store.fault = () => 'none';
    await bench.pass(20);
    expect(bench.driver.facts().state).toBe('stopped');
  });

  test('a commit whose answer was lost is not made twice', async () => {
    const bench = makeBench();
    let n = 0;
    bench.store.fault = () => ((n += 1) % 3 === 0 ? 'answer-lost' : 'none');
    bench.driver.start();
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    expect(bench.link.motions).toHaveLength(3);
  });

  test('a run that another process has driven on is let go without a word to the controller', async () => {
    const bench = await underWay(30);
    bench.store.events.push({ seq: bench.store.events.length + 1, at: '', kind: 'step-began', data: {}, prev: '', hash: 'x' });
    const told = bench.link.commands.length;
    await bench.pass(120);
    expect(bench.driver.isOver()).toBe(true);
    expect(bench.link.commands).toHaveLength(told);
    expect(bench.link.mayRenew()).toBe(false);
  });
});

describe('the motion lease', () => {
  test('is renewed in motions and before a move that waits, and not in a dwell, hold or end', async () => {
    const bench = await underWay(4);
    expect(bench.driver.state().state).toBe('moving');
    expect(bench.link.mayRenew()).toBe(true);
    await bench.pass(26);
    expect(bench.link.mayRenew()).toBe(false);
    await bench.pass(0, () => false);
    await bench.clock.advance(60_000, () => bench.driver.state().context.ahead !== null);
    expect(bench.link.mayRenew()).toBe(true);
    bench.driver.hold('Ben');
    expect(bench.link.mayRenew()).toBe(false);
  });

  test('is not renewed by a loop that is stuck', async () => {
    const bench = await underWay(4);
    let stuck = false;
    const commit = bench.store.commit.bind(bench.store);
    bench.store.commit = (write) => (stuck ? new Promise(() => undefined) : commit(write));
    stuck = true;
    await bench.pass(3);
    expect(bench.link.mayRenew()).toBe(true);
    await bench.pass(10);
    expect(bench.link.mayRenew()).toBe(false);
    expect(bench.driver.facts().reason).toContain('database is away');
  });
});
