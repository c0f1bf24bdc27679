import { verifyChain } from '@/shared/archive/chain';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { beats, brief, makeBench, runStart, sent, sha256, startUtcMs, underWay } from './rig-bench';

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
    expect(bench.driver.hold('Ben')).toMatchObject({ ok: true, serverAtUtcMs: startUtcMs + 30_000 });
    await bench.pass(1);
    expect(holdsSentBeforeWrite).toEqual([1, 1]);
  });

  test('in a dwell moves nothing, closes the row as cut short, and resume begins the dwell anew at the length first planned', async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: 'Ben asked to hold.',
      current: null,
      mayResume: { ok: true },
      intervention: { kind: 'hold', by: 'Ben', serverAtUtcMs: startUtcMs + 30_000 },
    });
    expect(bench.driver.facts().intervention?.confirmedAtUtcMs).toBeGreaterThan(startUtcMs + 30_000);
    expect(bench.store.log().at(-1)).toMatchObject({
      kind: 'dwell',
      outcome: 'cut short',
      endUtcMs: startUtcMs + 30_000,
      angleEndDeg: 20.18,
    });
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
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: 'Ben asked to hold when the step had ended.',
      holdAfterDwell: false,
    });
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done']);
    expect(bench.link.angleDeg).toBe(20.18);
    await bench.driver.resume('Ben');
    await bench.pass(200);
    expect(bench.driver.facts().state).toBe('finished');
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
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
