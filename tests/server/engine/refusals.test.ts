import { type Bench, brief, makeBench, sent, underWay } from './rig-bench';

describe('what the controller refuses or does not do', () => {
  test('a refused move fails the run with the controller’s reason', async () => {
    const bench = await underWay(0.001);
    bench.link.refuseNext = { code: 'flag', message: 'this controller has no home flag' };
    await bench.pass(10);
    expect(bench.driver.facts()).toMatchObject({
      state: 'failed',
      reason: 'The controller refused the motion: this controller has no home flag',
    });
    expect(sent(bench, 'stop')).toHaveLength(1);
    expect(brief(bench)).toEqual(['home failed']);
  });

  test('a timed move that came too late is made at once and its row is late', async () => {
    const bench = await underWay(60);
    bench.link.refuseNext = { code: 'past', message: 'the time of beginning has passed' };
    bench.link.send = delayed(bench.link.send.bind(bench.link), bench, 4000);
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(brief(bench)).toContain('swing late');
  });

  test('a controller that is deaf to a move holds the run', async () => {
    const bench = await underWay(60);
    bench.link.deaf = true;
    await bench.pass(120);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('never') });
  });

  test('a controller that never answers fails the run', async () => {
    const bench = makeBench();
    bench.link.up = false;
    bench.driver.start();
    await bench.pass(90);
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('never answered') });
  });

  test('motion that nobody asked for holds the run', async () => {
    const bench = await underWay(30);
    bench.link.send({ kind: 'move', id: 'somebody else', targetDeg: 0, speedDegS: 1, accelerationDegS2: 1, startUtcMs: null });
    await bench.pass(2);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('without a command of this run') });
  });

  test('a rig that is not ready fails the start with what is to be done', async () => {
    const bench = makeBench();
    bench.link.interlockClosed = false;
    bench.driver.start();
    await bench.pass(1);
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: 'The interlock is open; close it, then start again.' });
    expect(bench.link.motions).toHaveLength(0);
  });
});

function delayed(send: Bench['link']['send'], bench: Bench, ms: number): Bench['link']['send'] {
  return (command) => {
    if (command.kind === 'move') bench.clock.after(ms, () => send(command));
    else send(command);
  };
}
