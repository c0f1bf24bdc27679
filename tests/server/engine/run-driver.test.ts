import { verifyChain } from '@/shared/archive/chain';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { type Bench, makeBench, runStart, sha256, shortProtocol, startUtcMs, underWay } from './rig-bench';

const brief = (bench: Bench) => bench.store.log().map(({ kind, outcome }) => `${kind} ${outcome}`);
const sent = (bench: Bench, ...kinds: string[]) => bench.link.commands.filter(({ kind }) => kinds.includes(kind));
const reasonOf = (bench: Bench) => bench.driver.facts().reason;

const beats: ProtocolDocument = {
  formatVersion: 1,
  name: 'Beats',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'repeat', times: 3, steps: [{ kind: 'swing', to: 'far' }, { kind: 'dwell', beat_periods: 2 }, { kind: 'swing', to: 'near' }, { kind: 'dwell', beat_periods: 2 }] }],
};

test('a run goes through its protocol and leaves a whole log and a valid chain', async () => {
  const bench = await underWay(300);
  expect(bench.driver.facts()).toMatchObject({ state: 'finished', reason: '', dwellsDone: 2, dwellsPlanned: 2, mayResume: { ok: false } });
  expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
  expect(bench.store.log().map(({ station }) => station)).toEqual(['inline', 'near', 'near', 'near', 'far', 'far']);
  expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true, events: bench.store.events.length });
  expect(bench.store.kinds().slice(0, 3)).toEqual(['run-started', 'step-began', 'step-ended']);
  expect(bench.store.kinds().at(-1)).toBe('finished');
});

test('a beat is exact: every move after a dwell is sent ahead with the planned end as its start time', async () => {
  const bench = await underWay(6000, runStart(beats));
  expect(bench.driver.facts().state).toBe('finished');
  const swings = bench.store.log().filter(({ kind, path }) => kind === 'swing' && path.includes('repeat'));
  const beatMs = 2 * 1000 * (demoRigWide.measured?.period_s?.value ?? 0);
  const begins = swings.map(({ startUtcMs: begin }) => begin);
  for (let i = 1; i < begins.length; i += 1) expect((begins[i] ?? 0) - (begins[i - 1] ?? 0)).toBeCloseTo(beatMs, 3);
  const timed = sent(bench, 'move').filter((command) => command.kind === 'move' && command.startUtcMs !== null);
  expect(timed).toHaveLength(5);
  expect(swings.map(({ path }) => path)).toContain('3.repeat[2].3.swing');
});

test('the rows join: each begins where the one before it ended', async () => {
  const bench = await underWay(6000, runStart(beats));
  const rows = bench.store.log();
  for (let i = 1; i < rows.length; i += 1) expect(Math.abs((rows[i]?.startUtcMs ?? 0) - (rows[i - 1]?.endUtcMs ?? 0))).toBeLessThan(50);
});

describe('hold', () => {
  test('goes to the controller before anything is saved', async () => {
    const bench = await underWay(30);
    const holdsSentBeforeWrite: number[] = [];
    bench.store.fault = () => {
      holdsSentBeforeWrite.push(sent(bench, 'hold').length);
      return 'none';
    };
    expect(bench.driver.hold('Ben')).toEqual({ ok: true, serverAtUtcMs: startUtcMs + 30_000 });
    await bench.pass(1);
    expect(holdsSentBeforeWrite).toEqual([1, 1]);
  });

  test('in a dwell moves nothing, closes the row as cut short, and resume begins the dwell anew at the length first planned', async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: 'Ben asked to hold.', current: null, mayResume: { ok: true }, intervention: { kind: 'hold', by: 'Ben', serverAtUtcMs: startUtcMs + 30_000 } });
    expect(bench.driver.facts().intervention?.confirmedAtUtcMs).toBeGreaterThan(startUtcMs + 30_000);
    expect(bench.store.log().at(-1)).toMatchObject({ kind: 'dwell', outcome: 'cut short', endUtcMs: startUtcMs + 30_000, angleEndDeg: 20.18 });
    expect(await bench.driver.resume('Cleo')).toMatchObject({ ok: true });
    await bench.pass(300);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell cut short', 'dwell done', 'mark done', 'swing done', 'dwell done']);
    const again = bench.store.log()[3];
    expect((again?.endUtcMs ?? 0) - (again?.startUtcMs ?? 0)).toBeCloseTo(60_000, 6);
    expect(bench.store.kinds()).toEqual(expect.arrayContaining(['hold-requested', 'held', 'resumed']));
  });

  test('in a swing decelerates; resume finishes the move, marks it late, and the cadence starts anew', async () => {
    const bench = await underWay(2, runStart(beats));
    await bench.pass(100, () => bench.store.log().at(-1)?.path === '3.repeat[1].1.swing');
    await bench.pass(3);
    expect(bench.driver.state().state).toBe('moving');
    bench.driver.hold('Ben');
    await bench.pass(600);
    expect(bench.driver.facts().state).toBe('held');
    const cut = bench.store.log().at(-1);
    expect(cut).toMatchObject({ kind: 'swing', outcome: 'cut short', station: '' });
    expect(Math.abs((cut?.angleEndDeg ?? 0) - 20.18)).toBeGreaterThan(0.1);
    await bench.driver.resume('Ben');
    await bench.pass(2000);
    const late = bench.store.log().find(({ outcome }) => outcome === 'late');
    expect(late).toMatchObject({ kind: 'swing', path: cut?.path, angleStartDeg: cut?.angleEndDeg });
    const dwell = bench.store.log().find(({ kind, seq }) => kind === 'dwell' && seq > (late?.seq ?? 0));
    expect((dwell?.endUtcMs ?? 0) - (late?.startUtcMs ?? 0)).toBeCloseTo(840_000, 3);
  });

  test('a hold that overtakes a move which is being saved: the move is never sent', async () => {
    const bench = await underWay(5);
    let overtaken = false;
    bench.store.fault = (write) => {
      const waits = (write.snapshot as { context: { ahead: unknown } }).context.ahead !== null;
      if (waits && !overtaken) {
        overtaken = true;
        bench.driver.hold('Ben');
      }
      return 'none';
    };
    await bench.pass(120);
    expect(overtaken).toBe(true);
    expect(bench.driver.facts().state).toBe('held');
    expect(bench.link.motions).toHaveLength(2);
    expect(bench.link.angleDeg).toBe(20.18);
  });

  test('of a run that is over is refused with a sentence', async () => {
    const bench = await underWay(300);
    expect(bench.driver.hold('Ben')).toEqual({ ok: false, why: 'The run is over.' });
    expect(bench.driver.stop('Ben')).toEqual({ ok: false, why: 'The run is over.' });
  });
});

describe('hold after this dwell', () => {
  test.each([
    ['long before its end', 20],
    ['when the next move already waits in the controller', 65.5],
  ])('%s: the dwell is whole, then the run is held and nothing has moved', async (_, seconds) => {
    const bench = await underWay(seconds);
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(0.5);
    expect(bench.driver.facts()).toMatchObject({ state: 'running', holdAfterDwell: true });
    await bench.pass(60);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: 'Ben asked to hold when the step had ended.', holdAfterDwell: false });
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done']);
    expect(bench.link.angleDeg).toBe(20.18);
    await bench.driver.resume('Ben');
    await bench.pass(200);
    expect(bench.driver.facts().state).toBe('finished');
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
  });
});

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
    expect(await bench.driver.resume('Cleo')).toEqual({ ok: false, why: 'The rig is not armed. A named person has to arm it on site first.' });
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
    expect(bench.driver.facts()).toMatchObject({ state: 'stopped', reason: 'Ben stopped the run.', intervention: { kind: 'stop', by: 'Ben' } });
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

describe('what the controller refuses or does not do', () => {
  test('a refused move fails the run with the controller’s reason', async () => {
    const bench = await underWay(0.001);
    bench.link.refuseNext = { code: 'flag', message: 'this controller has no home flag' };
    await bench.pass(10);
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: 'The controller refused the motion: this controller has no home flag' });
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

  test('a controller that is deaf to a move fails the run', async () => {
    const bench = await underWay(60);
    bench.link.deaf = true;
    await bench.pass(120);
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('never') });
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

describe('the arm ends while the run is under way', () => {
  test('the run holds when its step ends, and goes on with a new arm', async () => {
    const bench = await underWay(1, runStart(shortProtocol, { arm: { name: 'Ada Quill', untilUtcMs: startUtcMs + 40_000 } }));
    await bench.pass(120);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: 'The arm of Ada Quill has ended. Arm the rig again on site, then resume.' });
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done']);
    bench.arm.now = { name: 'Ada Quill', untilUtcMs: startUtcMs + 3_600_000 };
    await bench.driver.resume('Ada Quill');
    await bench.pass(200);
    expect(bench.driver.facts().state).toBe('finished');
  });
});

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
    expect(reasonOf(bench)).toContain('database is away');
  });
});

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
    (Object.keys(faults) as (keyof typeof faults)[]).flatMap((fault) => (['hold', 'resume', 'stop'] as const).map((onInterruption) => ({ when, seconds, fault, onInterruption }))),
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

  test('a gap of more than 10 min holds the run although its protocol says resume', async () => {
    const bench = await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    bench.link.drop(1_200_000);
    await bench.pass(1400);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: 'The link to the controller was lost. It lasted more than 10 min.' });
  });

  test.each([
    ['interlock', 'hold', 'held'], ['interlock', 'resume', 'held'], ['interlock', 'stop', 'stopped'],
    ['reset', 'hold', 'held'], ['reset', 'resume', 'held'], ['reset', 'stop', 'stopped'],
  ] as const)('%s under %s: %s, and the arm is void', async (fault, onInterruption, state) => {
    for (const [, seconds] of moments) {
      const bench = await underWay(seconds, runStart({ ...shortProtocol, onInterruption }));
      if (fault === 'interlock') bench.link.openInterlock();
      else bench.link.reset();
      await bench.pass(300);
      expect(bench.driver.facts().state).toBe(state);
      expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm' }));
    }
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
