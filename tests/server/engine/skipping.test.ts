import { skipPlan } from '@/server/engine/remaining-plan';
import { beats, brief, type Bench, runStart, sent, shortProtocol, startUtcMs, underWay } from './rig-bench';

const rowOf = (bench: Bench) => bench.driver.state().context.step?.row.seq ?? 0;
const skip = (bench: Bench, seq = rowOf(bench)) => bench.driver.requests.skip('Cleo', seq);
const goods = (bench: Bench) =>
  bench.store
    .log()
    .filter(({ kind }) => kind === 'dwell')
    .map(({ path, outcome, good }) => `${path.replace(/^3\.repeat/, '')} ${outcome} ${good}`);
/** Until a row with this path is under way, and some seconds more. */
const inside = async (bench: Bench, path: string, seconds = 30) => {
  await bench.pass(6000, () => bench.store.log().at(-1)?.path === path);
  await bench.pass(seconds);
};

describe('skipping a dwell', () => {
  test('ends it there and then, writes who did it, and swings at once; its partner in the pair counts no more', async () => {
    const bench = await underWay(2, runStart(beats));
    await inside(bench, '3.repeat[1].4.dwell');
    const nowUtcMs = bench.clock.utcMs();
    expect(skipPlan(bench.start, bench.driver.state(), nowUtcMs)).toMatchObject({
      path: '3.repeat[1].4.dwell',
      station: 'near',
      notGoodPath: '3.repeat[1].2.dwell',
      dwellsLeft: 4,
      firstMotion: { kind: 'swing', to: 'far' },
    });
    expect(await skip(bench)).toMatchObject({ ok: true, serverAtUtcMs: nowUtcMs });
    await bench.pass(6000);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 5, dwellsGood: 4, dwellsUnpaired: 1 });
    expect(goods(bench)).toEqual([
      '[1].2.dwell done false',
      '[1].4.dwell skipped false',
      '[2].2.dwell done true',
      '[2].4.dwell done true',
      '[3].2.dwell done true',
      '[3].4.dwell done true',
    ]);
    const left = bench.store.log().find(({ outcome }) => outcome === 'skipped');
    expect(left?.endUtcMs).toBe(nowUtcMs);
    const next = bench.store.log().find(({ path }) => path === '3.repeat[2].1.swing');
    expect((next?.startUtcMs ?? 0) - nowUtcMs).toBeLessThan(500);
    const { data } = bench.store.events.find(({ kind }) => kind === 'skipped') ?? { data: {} };
    expect(data).toMatchObject({ by: 'Cleo', path: '3.repeat[1].4.dwell', kind: 'dwell', arm: { name: 'Ada Quill' } });
    expect(bench.store.events.filter(({ kind }) => kind === 'dwell-not-good')).toMatchObject([{ data: { path: '3.repeat[1].2.dwell' } }]);
  });

  test('that is the first of its pair takes the second with it, and the finish comes as the plan after the skip said', async () => {
    const bench = await underWay(2, runStart(beats));
    await inside(bench, '3.repeat[2].2.dwell');
    const plan = skipPlan(bench.start, bench.driver.state(), bench.clock.utcMs());
    expect(plan).toMatchObject({ notGoodPath: null, dwellsLeft: 3 });
    expect(plan?.leftS).toBeGreaterThan(700);
    await skip(bench);
    await bench.pass(6000);
    expect(bench.driver.facts()).toMatchObject({ dwellsDone: 5, dwellsGood: 4, dwellsUnpaired: 1 });
    expect(goods(bench)).toEqual([
      '[1].2.dwell done true',
      '[1].4.dwell done true',
      '[2].2.dwell skipped false',
      '[2].4.dwell done false',
      '[3].2.dwell done true',
      '[3].4.dwell done true',
    ]);
    expect(Math.abs((bench.driver.facts().endedAtUtcMs ?? 0) - (plan?.finishUtcMs ?? 0))).toBeLessThan(2_000);
  });

  test('both of a pair leaves the next pair whole', async () => {
    const bench = await underWay(2, runStart(beats));
    await inside(bench, '3.repeat[1].2.dwell');
    await skip(bench);
    await inside(bench, '3.repeat[1].4.dwell');
    await skip(bench);
    await bench.pass(6000);
    expect(goods(bench).map((words) => words.split(' ').at(-1))).toEqual(['false', 'false', 'true', 'true', 'true', 'true']);
  });

  test('of a held run goes on with the next step instead of beginning it anew', async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    expect(bench.driver.facts().maySkip).toEqual({ ok: true, why: '', seq: 3 });
    expect(await skip(bench)).toMatchObject({ ok: true });
    await bench.pass(300);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell skipped', 'mark done', 'swing done', 'dwell done']);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', intervention: { kind: 'skip', by: 'Cleo' } });
    // The last dwell of a protocol without repeats was the second of the pair.
    expect(bench.store.log().at(-1)).toMatchObject({ kind: 'dwell', good: false });
  });

  test('survives a restart between the skipped dwell and the second of its pair', async () => {
    const bench = await underWay(30, runStart({ ...shortProtocol, onInterruption: 'resume' }));
    await skip(bench);
    await bench.pass(20);
    await bench.restart(5);
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.store.log().at(-1)).toMatchObject({ kind: 'dwell', outcome: 'done', good: false });
  });

  test('asked for twice is done once', async () => {
    const bench = await underWay(30);
    const seq = rowOf(bench);
    const answers = await Promise.all([skip(bench, seq), skip(bench, seq)]);
    expect(answers.map(({ ok }) => ok)).toEqual([true, false]);
    await bench.pass(300);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell skipped', 'mark done', 'swing done', 'dwell done']);
  });
});

test('a wait is skipped without breaking any pair', async () => {
  const steps = shortProtocol.steps.flatMap((step) => (step.kind === 'mark' ? [{ kind: 'settle' as const, for_s: 600 }] : [step]));
  const bench = await underWay(2, runStart({ ...shortProtocol, steps }));
  await inside(bench, '4.settle');
  expect(await skip(bench)).toMatchObject({ ok: true });
  await bench.pass(300);
  expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'settle skipped', 'swing done', 'dwell done']);
  expect(goods(bench).map((words) => words.split(' ').at(-1))).toEqual(['true', 'true']);
});

describe('skipping is refused, and nothing moves', () => {
  const refused = async (bench: Bench, why: string, seq?: number) => {
    const before = bench.link.motions.length;
    expect(await skip(bench, seq)).toEqual({ ok: false, why: expect.stringContaining(why) });
    await bench.pass(0.2);
    expect(bench.link.motions).toHaveLength(before);
  };

  test('without an arm, and where the arm ends before the predicted finish', async () => {
    const bench = await underWay(30);
    bench.driver.hold('Ben');
    await bench.pass(1);
    bench.arm.now = null;
    await refused(bench, 'not armed');
    bench.arm.now = { name: 'Ada Quill', untilUtcMs: startUtcMs + 60_000 };
    await refused(bench, 'before the predicted finish');
  });

  test('in a motion, and held in one', async () => {
    const bench = await underWay(4);
    expect(bench.driver.state().state).toBe('moving');
    await refused(bench, 'Only a dwell, a settle or a wait');
    bench.driver.hold('Ben');
    await bench.pass(10);
    await refused(bench, 'A motion cannot be left out');
  });

  test('when the step that was reviewed is over', async () => {
    const bench = await underWay(30);
    await refused(bench, 'is over', rowOf(bench) - 1);
  });

  test('when the next move is on the way already', async () => {
    const bench = await underWay(30);
    await bench.pass(60, () => bench.driver.state().context.ahead !== null);
    await refused(bench, 'within 2 s');
  });

  test('while a hold waits for the end of the step, and while the database is away', async () => {
    const bench = await underWay(30);
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(0.1);
    await refused(bench, 'Withdraw that first');
    bench.store.fault = () => 'away';
    bench.driver.noteDatabaseAway(bench.clock.utcMs());
    await refused(bench, 'database does not answer');
  });
});

describe('a hold that waits for the end of the dwell', () => {
  test('is withdrawn: the run goes on as planned, and the log says who asked and who withdrew', async () => {
    const bench = await underWay(30);
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(1);
    expect(bench.driver.facts().holdAfterDwell).toBe(true);
    expect(await bench.driver.requests.withdrawHold('Cleo')).toMatchObject({ ok: true });
    expect(bench.driver.facts()).toMatchObject({ holdAfterDwell: false, intervention: { kind: 'hold-withdrawn', by: 'Cleo' } });
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
    expect(bench.store.events.find(({ kind }) => kind === 'hold-after-dwell-withdrawn')?.data).toEqual({ by: 'Cleo', askedBy: 'Ben' });
  });

  test('and whose next move was cancelled in the controller is withdrawn in the last second: the move is made all the same, once', async () => {
    const bench = await underWay(30);
    await bench.pass(60, () => bench.driver.state().context.ahead !== null);
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(0.1);
    expect(await bench.driver.requests.withdrawHold('Cleo')).toMatchObject({ ok: true });
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.store.log().filter(({ kind }) => kind === 'swing')).toHaveLength(2);
    expect(sent(bench, 'move')).toHaveLength(3);
    expect(bench.link.motions).toHaveLength(3);
  });

  test('cannot be withdrawn when it has taken hold, nor when there is none', async () => {
    const bench = await underWay(30);
    expect(await bench.driver.requests.withdrawHold('Cleo')).toEqual({ ok: false, why: expect.stringContaining('No hold is waiting') });
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(100);
    expect(bench.driver.facts().state).toBe('held');
    expect(await bench.driver.requests.withdrawHold('Cleo')).toEqual({ ok: false, why: expect.stringContaining('No hold is waiting') });
    expect(bench.driver.facts().state).toBe('held');
  });
});
