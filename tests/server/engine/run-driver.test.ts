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

  test('in homing closes the row as cut short; resume homes again', async () => {
    const bench = makeBench();
    bench.link.angleDeg = 12;
    bench.driver.start();
    await bench.pass(5);
    expect(bench.driver.state().state).toBe('homing');
    bench.driver.hold('Ben');
    await bench.pass(1);
    expect(brief(bench)).toEqual(['home cut short']);
    await bench.driver.resume('Ben');
    await bench.pass(400);
    expect(bench.driver.facts().state).toBe('finished');
    expect(brief(bench).slice(0, 3)).toEqual(['home cut short', 'home done', 'swing done']);
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
    expect(bench.store.log().find(({ kind, outcome }) => kind === 'swing' && outcome === 'cut short')).toMatchObject({ startUtcMs: startsAt, plannedStartUtcMs: startsAt });
    expect(brief(bench)).toContain('swing late');
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

describe('other steps', () => {
  const steps = (...list: ProtocolDocument['steps']): ProtocolDocument => ({ formatVersion: 1, name: 'Steps', steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, ...list] });

  test('settle lasts as long as it says', async () => {
    const bench = await underWay(200, runStart(steps({ kind: 'settle', for_s: 90, label: 'heat' }, { kind: 'swing', to: 'far' })));
    const [, , settled, swing] = bench.store.log();
    expect(settled).toMatchObject({ kind: 'settle', outcome: 'done', label: 'heat', station: 'near', good: null });
    expect((settled?.endUtcMs ?? 0) - (settled?.startUtcMs ?? 0)).toBeCloseTo(90_000, 6);
    expect(swing?.startUtcMs).toBe(settled?.endUtcMs);
  });

  // 22:00 UTC on 1 March is 23:00 in Oslo (UTC+1 in winter).
  test.each([
    { when: 'still to come: waited for', until: { localTime: '23:05' }, state: 'finished', waitedS: 300 },
    { when: 'past: gone on', until: { localTime: '22:00' }, state: 'finished', waitedS: 0 },
    { when: 'past and to be held', until: { localTime: '22:00', ifPast: 'hold' as const }, state: 'held', waitedS: 0 },
  ])('wait until a local time that is $when', async ({ until, state, waitedS }) => {
    const bench = await underWay(700, runStart(steps({ kind: 'wait', until }, { kind: 'swing', to: 'far' })));
    expect(bench.driver.facts().state).toBe(state);
    const wait = bench.store.log()[2];
    expect(wait?.outcome).toBe('done');
    expect((wait?.endUtcMs ?? 0) - startUtcMs).toBeCloseTo(waitedS === 0 ? (wait?.startUtcMs ?? 0) - startUtcMs : 1000 * waitedS, 6);
  });

  test('a repeat until a local time begins no pass that would end after it', async () => {
    const bench = await underWay(4000, runStart(steps({ kind: 'repeat', until: { localTime: '23:10' }, steps: [{ kind: 'swing', to: 'far' }, { kind: 'dwell', for_s: 60 }, { kind: 'swing', to: 'near' }, { kind: 'dwell', for_s: 60 }] })));
    expect(bench.driver.facts().state).toBe('finished');
    const last = bench.store.log().at(-1);
    expect(last?.endUtcMs).toBeLessThanOrEqual(startUtcMs + 600_000);
    expect(last?.path).toBe('3.repeat[4].4.dwell');
  });

  test('at the end the sources turn to the station asked for, and the drivers are released only if asked', async () => {
    const keep = await underWay(200, runStart({ ...shortProtocol, atEnd: { station: 'clear' } }));
    expect(keep.store.log().at(-1)).toMatchObject({ path: 'atEnd.swing', station: 'clear', outcome: 'done', angleEndDeg: 90 });
    expect(sent(keep, 'stop')).toEqual([]);
    const release = await underWay(200, runStart({ ...shortProtocol, atEnd: { drivers: 'release' } }));
    expect(sent(release, 'stop')).toEqual([expect.objectContaining({ releaseDrivers: true })]);
    expect(release.store.events.at(-1)).toMatchObject({ kind: 'finished', data: { drivers: 'release' } });
  });

  test('a protocol that begins to swing without a known position fails with what to do', async () => {
    const bench = makeBench(runStart({ ...shortProtocol, steps: [{ kind: 'swing', to: 'near' }] }));
    bench.link.angleDeg = null;
    bench.driver.start();
    await bench.pass(5);
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: 'Step 1.swing: the position of the turntable is not known. Begin the protocol with a home step.' });
  });

  test('a move that would leave the limits is not sent, whatever was checked before', async () => {
    const bench = await underWay(60, runStart(steps({ kind: 'swing', to: { angle_deg: 300 } })));
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('motion.maxDeg') });
    expect(bench.link.motions).toHaveLength(2);
  });

  test('a pass of the home edge is logged and proves the angle of the swing', async () => {
    const bench = await underWay(70);
    bench.link.edge(0.004, 'cw');
    await bench.pass(100);
    expect(bench.store.events.find(({ kind }) => kind === 'home-edge')?.data).toMatchObject({ angleDeg: 0.004, direction: 'cw' });
    expect(bench.store.log()[4]).toMatchObject({ kind: 'swing', angleSource: 'edge-verified' });
    expect(bench.store.log()[1]).toMatchObject({ kind: 'swing', angleSource: 'counted' });
  });
});

test('the predicted finish stands from the start and moves when the run is held up', async () => {
  const bench = await underWay(1);
  const planned = bench.driver.facts().predictedEndUtcMs;
  await bench.pass(29);
  expect(bench.driver.facts().predictedEndUtcMs).toBe(planned);
  bench.driver.hold('Ben');
  await bench.pass(100);
  expect(bench.driver.facts().predictedEndUtcMs).toBeNull();
  await bench.driver.resume('Ben');
  const later = bench.driver.facts().predictedEndUtcMs ?? 0;
  await bench.pass(300);
  expect(bench.driver.facts()).toMatchObject({ state: 'finished' });
  expect(Math.abs((bench.driver.facts().predictedEndUtcMs ?? 0) - later)).toBeLessThan(100);
});

test('listeners hear of each saved change, with what was saved', async () => {
  const bench = makeBench();
  const states: string[] = [];
  let lastSeq = 0;
  bench.driver.onChange(({ facts, events }) => {
    if (states.at(-1) !== facts.state) states.push(facts.state);
    for (const event of events) expect(event.seq).toBe((lastSeq += 1));
    expect(bench.store.events.at(-1)?.seq).toBe(facts.lastSeq);
  });
  bench.driver.start();
  await bench.pass(200);
  expect(states).toEqual(['running', 'finished']);
  expect(bench.performed.map((effect) => (effect.kind === 'notify' ? effect.topic : effect.kind))).toEqual(['started', 'finished']);
});
