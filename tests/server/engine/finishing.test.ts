import type { ProtocolDocument } from '@/shared/protocol/document';
import { resumePlan } from '@/server/engine/remaining-plan';
import { beats, brief, type Bench, runStart, underWay } from './rig-bench';

/** A run that ends before the end of its protocol: on a whole pair, with all that comes after the pairs. */

const night: ProtocolDocument = { ...beats, steps: [...beats.steps, { kind: 'settle', for_s: 60 }], atEnd: { station: 'clear' } };
const inside = async (bench: Bench, path: string, seconds = 30) => {
  await bench.pass(6000, () => bench.store.log().at(-1)?.path === path);
  await bench.pass(seconds);
};
const finish = (bench: Bench, finishByUtcMs: number | null = null, by = 'Cleo') => bench.driver.requests.finishEarly(by, finishByUtcMs);
const paths = (bench: Bench) => bench.store.log().map(({ path }) => path);
const logged = (bench: Bench, kind: string) => bench.store.events.filter((event) => event.kind === kind).map(({ data }) => data);

describe('a person asks for the end after the pair', () => {
  test.each(['3.repeat[1].2.dwell', '3.repeat[1].4.dwell'])(
    'in %s: the pair is made whole, none begins, what follows is carried out',
    async (path) => {
      const bench = await underWay(2, runStart(night));
      await inside(bench, path);
      const plannedEnd = bench.driver.facts().predictedEndUtcMs ?? 0;
      expect(await finish(bench)).toMatchObject({ ok: true });
      const facts = bench.driver.facts();
      expect(facts.finishing).toEqual({ by: 'Cleo', askedUtcMs: bench.clock.utcMs(), finishByUtcMs: null, withdrawnBy: null });
      // Two of three passes are left out: four swings, each with a beat of two periods of 420 s.
      expect(Math.abs(plannedEnd - (facts.predictedEndUtcMs ?? 0) - 4 * 840_000)).toBeLessThan(1_000);
      await bench.pass(6000);
      expect(paths(bench).slice(2)).toEqual([
        '3.repeat[1].1.swing',
        '3.repeat[1].2.dwell',
        '3.repeat[1].3.swing',
        '3.repeat[1].4.dwell',
        '4.settle',
        'atEnd.swing',
      ]);
      expect(bench.store.log().every(({ outcome }) => outcome === 'done')).toBe(true);
      expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 2, dwellsGood: 2 });
      expect(Math.abs((bench.driver.facts().endedAtUtcMs ?? 0) - (facts.predictedEndUtcMs ?? 0))).toBeLessThan(2_000);
      expect(logged(bench, 'finish-asked')).toEqual([{ by: 'Cleo' }]);
      expect(logged(bench, 'finished')).toMatchObject([{ dwells: 2, early: 'on a whole pair as Cleo asked' }]);
    },
  );

  test('while the first move of the next pair waits in the controller: that pair is still made, and is the last', async () => {
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[1].4.dwell', 0);
    await bench.pass(1000, () => bench.driver.state().context.ahead !== null);
    expect(await finish(bench)).toMatchObject({ ok: true });
    await bench.pass(6000);
    expect(paths(bench).filter((path) => path.endsWith('dwell'))).toEqual([
      '3.repeat[1].2.dwell',
      '3.repeat[1].4.dwell',
      '3.repeat[2].2.dwell',
      '3.repeat[2].4.dwell',
    ]);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsGood: 4 });
    expect(bench.store.log().every(({ outcome }) => outcome === 'done')).toBe(true);
  });

  test('taken back, the run goes on to the end of its protocol', async () => {
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[1].2.dwell');
    const { predictedEndUtcMs } = bench.driver.facts();
    await finish(bench);
    await bench.pass(100);
    expect(await bench.driver.requests.withdrawFinish('Ben')).toMatchObject({ ok: true });
    expect(bench.driver.facts()).toMatchObject({ finishing: { withdrawnBy: 'Ben' } });
    expect(Math.abs((bench.driver.facts().predictedEndUtcMs ?? 0) - (predictedEndUtcMs ?? 0))).toBeLessThan(1_000);
    await bench.pass(12_000);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 6 });
    expect(logged(bench, 'finish-withdrawn')).toEqual([{ by: 'Ben', askedBy: 'Cleo' }]);
    expect(logged(bench, 'finished')[0]).not.toHaveProperty('early');
    expect(await bench.driver.requests.withdrawFinish('Ben')).toMatchObject({ ok: false });
  });

  test('is refused with the reason where nothing would be left out, where it is asked for already, and when the run is over', async () => {
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[3].2.dwell');
    expect(await finish(bench)).toEqual({ ok: false, why: expect.stringContaining('the last one of this run in any case') });
    const other = await underWay(2, runStart(night));
    await inside(other, '3.repeat[1].2.dwell');
    await finish(other);
    expect(await finish(other, null, 'Ben')).toEqual({ ok: false, why: 'The run is to end early already: Cleo asked for it.' });
    expect(await other.driver.requests.withdrawFinish('Ben')).toMatchObject({ ok: true });
    other.driver.stop('Ben');
    await other.pass(30);
    expect(await finish(other)).toEqual({ ok: false, why: 'The run is over.' });
  });

  test('survives a hold, a resume and a server that is killed', async () => {
    const bench = await underWay(2, runStart({ ...night, onInterruption: 'resume' }));
    await inside(bench, '3.repeat[1].2.dwell');
    bench.driver.hold('Ben');
    await bench.pass(20);
    expect(await finish(bench)).toMatchObject({ ok: true });
    await bench.driver.resume('Ben');
    await bench.pass(60);
    await bench.restart(5);
    await bench.pass(6000);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 2, finishing: { by: 'Cleo' } });
    expect(brief(bench).slice(-6)).toEqual(['dwell cut short', 'dwell done', 'swing done', 'dwell done', 'settle done', 'swing done']);
  });
});

test('where the sides of a pair stand in repeats of their own, in any order, the pair is made whole', async () => {
  const side = (to: 'near' | 'far') => ({
    kind: 'repeat' as const,
    times: 1,
    steps: [
      { kind: 'swing' as const, to },
      { kind: 'dwell' as const, for_s: 60 },
    ],
  });
  const steps: ProtocolDocument['steps'] = [
    { kind: 'home' },
    { kind: 'repeat', times: 3, order: 'shuffled', steps: [side('near'), side('far')] },
  ];
  const bench = await underWay(2, runStart({ ...beats, steps }, { shuffleSeed: 3 }));
  await bench.pass(600, () => bench.store.log().at(-1)?.kind === 'dwell');
  expect(await finish(bench)).toMatchObject({ ok: true });
  await bench.pass(600);
  expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 2 });
});

test('asked for while a move waits, then held: the plan of the resume is already the one that is carried out', async () => {
  const bench = await underWay(2, runStart(night));
  await inside(bench, '3.repeat[1].4.dwell', 0);
  await bench.pass(1000, () => bench.driver.state().context.ahead !== null);
  await finish(bench);
  bench.driver.hold('Ben');
  await bench.pass(10);
  const plan = resumePlan(bench.start, bench.driver.state(), bench.clock.utcMs());
  await bench.driver.resume('Ben');
  await bench.pass(12_000);
  expect(bench.driver.facts().state).toBe('finished');
  expect(Math.abs((bench.driver.facts().endedAtUtcMs ?? 0) - (plan?.finishUtcMs ?? 0))).toBeLessThan(5_000);
});

describe('the night window asks', () => {
  test('nothing is promised where nothing would be left out, or not even the pair under way would be over in time', async () => {
    const flat = await underWay(30);
    expect(await finish(flat, flat.clock.utcMs(), '')).toMatchObject({
      ok: false,
      why: expect.stringContaining('Nothing would be left out'),
    });
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[1].2.dwell');
    expect(await finish(bench, bench.clock.utcMs() + 60_000, '')).toMatchObject({
      ok: false,
      why: expect.stringContaining('Not even the pair under way'),
    });
    expect(bench.driver.facts().finishing).toBeNull();
    expect([...logged(flat, 'finish-early-refused'), ...logged(bench, 'finish-early-refused')]).toEqual([]);
  });

  test('the pairs after which the run is over in time are made, with the way to the last station; the others are not', async () => {
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[1].2.dwell');
    const plannedEnd = bench.driver.facts().predictedEndUtcMs ?? 0;
    const byUtcMs = plannedEnd - 60_000;
    expect(await finish(bench, byUtcMs, '')).toMatchObject({ ok: true });
    await bench.pass(12_000);
    const facts = bench.driver.facts();
    expect(facts).toMatchObject({ state: 'finished', dwellsDone: 4 });
    expect(facts.endedAtUtcMs).toBeLessThanOrEqual(byUtcMs);
    expect(paths(bench).at(-1)).toBe('atEnd.swing');
    expect(logged(bench, 'finish-asked')).toEqual([{ by: 'the night window', overBy: new Date(byUtcMs).toISOString() }]);
    expect(logged(bench, 'finished')).toMatchObject([{ early: 'on a whole pair before the end of the night window' }]);
  });

  test('no pair is left out of a run that is over in time, and what somebody took back is not asked again', async () => {
    const bench = await underWay(2, runStart(night));
    await inside(bench, '3.repeat[1].2.dwell');
    const byUtcMs = (bench.driver.facts().predictedEndUtcMs ?? 0) - 60_000;
    expect(await finish(bench, byUtcMs, '')).toMatchObject({ ok: true });
    await bench.driver.requests.withdrawFinish('Ben');
    expect(await finish(bench, byUtcMs, '')).toMatchObject({ ok: false, why: expect.stringContaining('decided') });
    // A person may still change their mind.
    expect(await finish(bench)).toMatchObject({ ok: true });
    const whole = await underWay(2, runStart(night));
    await inside(whole, '3.repeat[1].2.dwell');
    expect(await finish(whole, (whole.driver.facts().predictedEndUtcMs ?? 0) + 60_000, '')).toMatchObject({ ok: false });
    await whole.pass(12_000);
    expect(whole.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 6 });
  });
});
