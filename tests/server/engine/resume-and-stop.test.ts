import { type Bench, brief, runStart, shortProtocol, startUtcMs, underWay } from './rig-bench';

describe('resume is refused', () => {
  const held = async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    return bench;
  };
  const nothingMoved = async (bench: Bench) => {
    await bench.pass(100);
    expect(bench.driver.facts().state).toBe('held');
    expect(bench.link.motions).toHaveLength(2);
  };

  test('without an arm', async () => {
    const bench = await held();
    bench.arm.now = null;
    expect(await bench.driver.resume('Cleo')).toEqual({
      ok: false,
      why: 'The rig is not armed. A named person has to arm it on site first.',
    });
    await nothingMoved(bench);
  });

  test('when the arm ends before the predicted finish', async () => {
    const bench = await held();
    bench.arm.now = { name: 'Ada Quill', untilUtcMs: startUtcMs + 60_000 };
    expect(await bench.driver.resume('Cleo')).toMatchObject({ ok: false, why: expect.stringContaining('before the predicted finish') });
    await nothingMoved(bench);
  });

  test('while the interlock is open, and after it until the rig is armed again', async () => {
    const bench = await held();
    bench.link.openInterlock();
    await bench.pass(1);
    expect(bench.driver.facts().mayResume).toEqual({ ok: false, why: 'The interlock is open; close it first.' });
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm' }));
    bench.arm.now = null;
    bench.link.closeInterlock();
    await bench.pass(1);
    expect((await bench.driver.resume('Cleo')).ok).toBe(false);
    bench.arm.now = { name: 'Ada Quill', untilUtcMs: startUtcMs + 7_200_000 };
    expect((await bench.driver.resume('Cleo')).ok).toBe(true);
  });

  test('after the controller has lost its position', async () => {
    const bench = await held();
    bench.link.reset();
    await bench.pass(1);
    expect(bench.driver.facts().mayResume.why).toContain('does not know its position');
  });

  test('while the link is down', async () => {
    const bench = await held();
    bench.link.drop(60_000);
    await bench.pass(10);
    expect(bench.driver.facts().mayResume.why).toContain('link to the controller is down');
  });

  test('when the run is not held', async () => {
    const bench = await underWay(30);
    expect(await bench.driver.resume('Cleo')).toEqual({ ok: false, why: 'The run is not held.' });
  });
});

describe('stop', () => {
  test.each([0.001, 0.5, 2, 4, 30, 66.5, 70, 100])('at %s s ends the run; nothing moves after it', async (seconds) => {
    const bench = await underWay(seconds);
    bench.driver.stop('Ben');
    await bench.pass(0.2);
    const before = bench.link.motions.length;
    await bench.pass(600);
    expect(bench.driver.facts()).toMatchObject({
      state: 'stopped',
      reason: 'Ben stopped the run.',
      intervention: { kind: 'stop', by: 'Ben' },
    });
    expect(bench.link.motions).toHaveLength(before);
    expect(bench.store.log().every(({ outcome }) => outcome !== null)).toBe(true);
    expect(bench.store.kinds()).toEqual(expect.arrayContaining(['stop-requested', 'stopped']));
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm', reason: 'the run was stopped' }));
  });

  test('while held', async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    bench.driver.stop('Cleo');
    await bench.pass(1);
    expect(bench.driver.facts().state).toBe('stopped');
  });

  test('is shown as not confirmed when the controller never says that it stands still', async () => {
    const bench = await underWay(30);
    bench.link.deaf = true;
    bench.driver.stop('Ben');
    await bench.pass(30);
    expect(bench.driver.facts()).toMatchObject({ state: 'stopping', intervention: { confirmedAtUtcMs: null } });
    await bench.pass(60);
    expect(bench.driver.facts()).toMatchObject({ state: 'stopped', intervention: { confirmedAtUtcMs: null } });
    expect(bench.store.events.at(-1)).toMatchObject({ kind: 'stopped', data: { confirmed: false } });
  });
});

describe('the arm ends while the run is under way', () => {
  test('the run holds when its step ends, and goes on with a new arm', async () => {
    const bench = await underWay(1, runStart(shortProtocol, { arm: { name: 'Ada Quill', untilUtcMs: startUtcMs + 40_000 } }));
    await bench.pass(120);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: 'The arm of Ada Quill has ended. Arm the rig again on site, then resume.',
    });
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done']);
    bench.arm.now = { name: 'Ada Quill', untilUtcMs: startUtcMs + 3_600_000 };
    await bench.driver.resume('Ada Quill');
    await bench.pass(200);
    expect(bench.driver.facts().state).toBe('finished');
  });
});

describe('a clock steps while the run is under way: the arm lasts no longer for it', () => {
  const arm = { name: 'Ada Quill', untilUtcMs: startUtcMs + 640_000 };

  test.each([
    ['the server’s is set ahead', 'host', 600_000, 'held'],
    ['the server’s is set back', 'host', -600_000, 'finished'],
    ['the controller’s jumps', 'controller', 600_000, 'finished'],
  ] as const)('%s', async (_, clock, byMs, state) => {
    const bench = await underWay(1, runStart(shortProtocol, { arm }));
    bench.link.say({ kind: 'clock-stepped', at: { utcMs: bench.clock.utcMs(), uS: 0.001 }, clock, byMs });
    await bench.pass(320);
    expect(bench.driver.facts().state).toBe(state);
    expect(bench.store.events.find(({ kind }) => kind === 'clock-stepped')?.data).toEqual({ clock, byMs });
  });
});

describe('somebody ends the arm while the run is under way', () => {
  const moments = [
    ['in homing', 0.02],
    ['in a swing', 4],
    ['in a dwell', 30],
    ['while a move waits in the controller', 66.3],
    ['in the swing after a dwell', 70],
  ] as const;

  test.each(moments)('%s: it is held, and nothing moves until the rig is armed again', async (_, seconds) => {
    const bench = await underWay(seconds);
    bench.arm.now = null;
    // A loop that only waits looks up at its next deadline, or after 30 s.
    await bench.pass(seconds === 30 ? 31 : 1);
    const stoodAt = bench.link.nowDeg();
    expect(bench.link.mayRenew()).toBe(false);
    await bench.pass(200);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: 'The arm of Ada Quill was ended. Arm the rig again on site, then resume.',
    });
    expect(bench.link.nowDeg()).toBe(stoodAt);
    expect((await bench.driver.resume('Ben')).ok).toBe(false);
    bench.arm.now = { name: 'Cleo Marsh', untilUtcMs: startUtcMs + 7_200_000 };
    expect((await bench.driver.resume('Ben')).ok).toBe(true);
    await bench.pass(400);
    expect(bench.driver.facts().state).toBe('finished');
  });

  test('a motion that was chosen in the same moment is not sent', async () => {
    const bench = await underWay(66.3);
    const ends = bench.driver.state().context.step?.row.plannedEndUtcMs ?? 0;
    expect(ends).toBeGreaterThan(startUtcMs + 66_300);
    bench.driver.hold('Ben');
    await bench.pass(1);
    await bench.driver.resume('Ben');
    bench.arm.now = null;
    const before = bench.link.motions.length;
    await bench.pass(400);
    expect(bench.link.motions).toHaveLength(before);
    expect(bench.driver.facts().state).toBe('held');
  });

  test('a run that another process takes up after it is held', async () => {
    const bench = await underWay(30, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.arm.now = null;
    await bench.restart(5);
    await bench.pass(200);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('was ended') });
  });
});
