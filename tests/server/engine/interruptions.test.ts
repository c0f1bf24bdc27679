import { verifyChain } from '@/shared/archive/chain';
import { type Bench, brief, runStart, sha256, shortProtocol, startUtcMs, underWay } from './rig-bench';

describe('interruptions', () => {
  const moments = [
    ['in homing', 0.02],
    ['in a swing', 4],
    ['in a dwell', 30],
    ['while a move waits in the controller', 66.3],
    ['in the swing after a dwell', 70],
  ] as const;
  const outcomes = { hold: 'held', resume: 'finished', stop: 'stopped' } as const;
  const faults = {
    'link dropped for 30 s': async (bench: Bench) => bench.link.drop(30_000),
    'server gone for 5 s': async (bench: Bench) => bench.restart(5),
  };
  const cells = moments.flatMap(([when, seconds]) =>
    (Object.keys(faults) as (keyof typeof faults)[]).flatMap((fault) =>
      (['hold', 'resume', 'stop'] as const).map((onInterruption) => ({ when, seconds, fault, onInterruption })),
    ),
  );

  test.each(cells)('$fault $when under $onInterruption', async ({ seconds, fault, onInterruption }) => {
    const bench = await underWay(seconds, runStart({ ...shortProtocol, onInterruption }));
    await faults[fault](bench);
    await bench.pass(400);
    expect(bench.driver.facts().state).toBe(outcomes[onInterruption]);
    expect(bench.store.log().filter(({ outcome }) => outcome === null)).toEqual([]);
    expect(bench.store.kinds()).toContain(fault.startsWith('link') ? 'link-lost' : 'server-restarted');
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    expect(new Set(bench.link.motions.map(({ commandId }) => commandId)).size).toBe(bench.link.motions.length);
  });

  test('under resume a broken move is finished first and its row is late', async () => {
    const bench = await underWay(70, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(30_000);
    await bench.pass(400);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing cut short', 'swing late', 'dwell done']);
    expect(bench.store.events.find(({ kind, data }) => kind === 'link-ready' && Number(data['gapS']) > 20)).toBeDefined();
  });

  test('under resume a dwell that nothing disturbed stays whole', async () => {
    const bench = await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(30_000);
    await bench.pass(400);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
  });

  test('a move that ended as it should while the link was down is done, with the controller’s own end', async () => {
    const bench = await underWay(75, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(30_000);
    await bench.pass(400);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
    const [swing, dwell] = bench.store.log().slice(4);
    expect(swing?.endUtcMs).toBeLessThan(startUtcMs + 80_000);
    expect(dwell?.startUtcMs).toBe(swing?.endUtcMs);
  });

  test('a hold that a dead process could not confirm is sent again by the next one', async () => {
    const bench = await underWay(30);
    bench.link.drop(60_000);
    bench.driver.hold('Ben');
    await bench.pass(1);
    await bench.restart(5);
    await bench.pass(60);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: 'Ben asked to hold.' });
    expect(bench.driver.facts().intervention?.confirmedAtUtcMs).toBeGreaterThan(startUtcMs + 90_000);
  });

  test('a move that began and ended while nobody listened is taken as begun at the time it was sent with', async () => {
    const bench = await underWay(65.5, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    const startsAt = bench.driver.state().context.ahead?.startUtcMs;
    expect(startsAt).toBeGreaterThan(startUtcMs + 65_500);
    await bench.restart(5);
    await bench.pass(400);
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.store.log().find(({ kind, outcome }) => kind === 'swing' && outcome === 'cut short')).toMatchObject({
      startUtcMs: startsAt,
      plannedStartUtcMs: startsAt,
    });
    expect(brief(bench)).toContain('swing late');
  });

  test('a gap of more than 10 min holds the run although its protocol says resume', async () => {
    const bench = await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(1_200_000);
    await bench.pass(1400);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: 'The link to the controller was lost. It lasted more than 10 min.',
    });
  });

  test.each([
    ['interlock', 'hold', 'held'],
    ['interlock', 'resume', 'held'],
    ['interlock', 'stop', 'stopped'],
    ['reset', 'hold', 'held'],
    ['reset', 'resume', 'held'],
    ['reset', 'stop', 'stopped'],
  ] as const)('%s under %s: %s, and the arm is void', async (fault, onInterruption, state) => {
    for (const [, seconds] of moments) {
      const bench = await underWay(seconds, runStart({ ...shortProtocol, onInterruption }));
      if (fault === 'interlock') bench.link.openInterlock();
      else bench.link.reset();
      await bench.pass(300);
      expect(bench.driver.facts().state).toBe(state);
      expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm' }));
      // The warning that is due after a start of the controller says nothing of the interlock.
      const told = bench.store.events.filter(({ kind }) => kind === 'interlock' || kind === 'controller-reset');
      expect(told.map(({ kind }) => kind)).toEqual([fault === 'interlock' ? 'interlock' : 'controller-reset']);
      expect(bench.driver.facts().reason).toContain(fault === 'interlock' ? 'interlock was opened' : 'controller restarted');
    }
  });

  test('an interlock that was opened and closed while no server ran holds the run under resume, and the arm is void', async () => {
    const bench = await underWay(30, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.warningDue = true;
    await bench.restart(5);
    await bench.pass(200);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('interlock was opened') });
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm', reason: 'the interlock was opened' }));
    expect(bench.store.events.find(({ kind }) => kind === 'interlock')?.data).toEqual({ closed: false, unseen: true });
  });

  test('so does a supply that was lost meanwhile, and the position with it', async () => {
    const bench = await underWay(30, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.angleDeg = null;
    await bench.restart(5);
    await bench.pass(200);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('supply was lost') });
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm' }));
  });

  test('an interlock that opened while the link was down holds the run under resume', async () => {
    const bench = await underWay(30, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(30_000);
    await bench.pass(10);
    bench.link.openInterlock();
    bench.link.closeInterlock();
    await bench.pass(200);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('interlock') });
  });
});
