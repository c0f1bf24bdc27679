import { verifyChain } from '@/shared/archive/chain';
import { type Bench, brief, makeBench, runStart, sent, sha256, shortProtocol, startUtcMs, underWay } from './rig-bench';

/** The database is gone for as long as `back` is not called, and the keeper of the rig lease has noticed. */
async function away(bench: Bench): Promise<Bench> {
  bench.store.fault = () => 'away';
  await bench.pass(4.5);
  bench.driver.noteDatabaseAway(bench.clock.utcMs() - 4500);
  await bench.pass(1);
  return bench;
}

/** It answers again; `told`: the keeper of the rig lease says so. */
function back(bench: Bench, told = true): void {
  bench.store.fault = () => 'none';
  if (told) bench.driver.noteDatabaseBack();
}

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
    expect(bench.driver.facts().reason).toMatch(/The database is away since 22:01:0\d UTC/);
    expect(sent(bench, 'hold')).toHaveLength(1);
    expect(bench.link.mayRenew()).toBe(false);
    await bench.pass(300);
    expect(bench.driver.facts().state).toBe(state);
    expect(bench.store.kinds()).toContain('database-away');
    if (state !== 'stopped') expect(bench.store.kinds()).toContain('database-back');
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    expect(await bench.journal.read()).toEqual([]);
  });

  test.each([
    ['hold', 'held', 'held'],
    ['resume', 'running', 'finished'],
    ['stop', 'stopped', 'stopped'],
  ] as const)(
    'an outage in a dwell, which has nothing to write, counts as well: under %s it is %s meanwhile, then %s',
    async (policy, meanwhile, then) => {
      const bench = await away(await underWay(20, runStart({ ...shortProtocol, onInterruption: policy })));
      await bench.pass(10);
      expect(bench.driver.facts().state).toBe(meanwhile);
      expect(bench.driver.facts().reason).toContain('The database is away since');
      expect(bench.store.kinds()).not.toContain('database-away');
      back(bench);
      await bench.pass(300);
      expect(bench.driver.facts().state).toBe(then);
      expect(bench.driver.facts().reason).not.toContain('away since');
      expect(bench.store.kinds()).toContain('database-away');
      if (policy !== 'stop') expect(bench.store.kinds()).toContain('database-back');
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    },
  );

  test('under resume a dwell that an outage did not outlast stays whole, and the next swing is timed', async () => {
    const bench = await away(await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' })));
    await bench.pass(10);
    back(bench);
    await bench.pass(300);
    expect(brief(bench)).toEqual(['home done', 'swing done', 'dwell done', 'mark done', 'swing done', 'dwell done']);
  });

  test('an outage that outlasts the dwell: nothing moves before it is over, and one of more than 10 min holds the run', async () => {
    const bench = await away(await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' })));
    const stoodAt = bench.link.nowDeg();
    await bench.pass(590);
    expect(bench.link.nowDeg()).toBe(stoodAt);
    expect(bench.driver.state().state).toBe('interrupted');
    await bench.pass(60);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', reason: expect.stringContaining('It lasted more than 10 min.') });
    back(bench);
    await bench.pass(10);
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
  });

  test('a resume while it is away is refused, and says why', async () => {
    const bench = await underWay(20);
    bench.driver.hold('Ben');
    await bench.pass(5);
    await away(bench);
    await bench.pass(1);
    expect(bench.driver.facts().mayResume).toEqual({ ok: false, why: 'The database is away; wait until it answers.' });
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: false, why: expect.stringContaining('database does not answer') });
    back(bench);
    await bench.pass(10);
    expect(bench.driver.facts().mayResume.ok).toBe(true);
  });

  test('stop works while it is away, is shown, and is in the log when it is back', async () => {
    const bench = await underWay(67);
    bench.store.fault = () => 'away';
    await bench.pass(3);
    bench.driver.stop('Ben');
    expect(sent(bench, 'stop')).toHaveLength(1);
    await bench.pass(10);
    expect(bench.driver.facts().state).toBe('stopped');
    expect(bench.driver.isDone()).toBe(false);
    const stoodAt = bench.link.nowDeg();
    await bench.pass(60);
    expect(bench.link.nowDeg()).toBe(stoodAt);
    bench.store.fault = () => 'none';
    await bench.pass(20);
    expect(bench.driver.isDone()).toBe(true);
    expect(bench.store.kinds()).toEqual(expect.arrayContaining(['stop-requested', 'stopped']));
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
  });

  test.each(['hold', 'stop'] as const)(
    'a %s that was answered is known to the next process, however short the outage and the life of this one',
    async (kind) => {
      const bench = await underWay(67.2, runStart({ ...shortProtocol, onInterruption: 'resume' }));
      bench.store.fault = () => 'away';
      const answer = bench.driver[kind]('Ben');
      let kept = false;
      if (answer.ok) void answer.kept?.then(() => (kept = true));
      await bench.clock.advance(1000, () => kept);
      expect(bench.clock.utcMs()).toBeLessThan(startUtcMs + 67_600);
      bench.store.fault = () => 'none';
      await bench.restart(5);
      await bench.pass(300);
      expect(bench.driver.facts().state).toBe(kind === 'hold' ? 'held' : 'stopped');
      expect(bench.store.kinds()).toContain(`${kind}-requested`);
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    },
  );

  test('what happened meanwhile is in the log, in order, although the process was killed before it was back', async () => {
    const bench = await away(await underWay(20, runStart({ ...shortProtocol, onInterruption: 'resume' })));
    await bench.pass(10);
    bench.link.openInterlock();
    await bench.pass(5);
    bench.link.closeInterlock();
    await bench.pass(5);
    const before = bench.store.events.length;
    back(bench, false);
    await bench.restart(5);
    await bench.pass(60);
    const kinds = bench.store.kinds().slice(before);
    expect(kinds.filter((kind) => ['database-away', 'interlock', 'held', 'server-restarted'].includes(kind))).toEqual([
      'database-away',
      'interlock',
      'held',
      'interlock',
      'server-restarted',
    ]);
    expect(bench.driver.facts().state).toBe('held');
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
  });

  test('a commit that got through although the journal had taken its write over is not made twice', async () => {
    const bench = await underWay(66);
    let calls = 0;
    bench.store.fault = () => ((calls += 1) < 6 ? 'answer-lost' : 'none');
    await bench.pass(300);
    expect(bench.driver.facts().state).toMatch(/held|finished/);
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    const seqs = bench.store.events.map(({ seq }) => seq);
    expect(seqs).toEqual(seqs.map((_, index) => index + 1));
  });

  test('when the journal takes nothing either, the run waits at rest with all it has to say, and stop still acts', async () => {
    const bench = await underWay(67);
    bench.journal.append = () => Promise.reject(new Error('the disk is full'));
    bench.store.fault = () => 'away';
    await bench.pass(10);
    const stoodAt = bench.link.nowDeg();
    bench.driver.stop('Ben');
    expect(sent(bench, 'stop')).toHaveLength(1);
    await bench.pass(60);
    expect(bench.link.nowDeg()).toBe(stoodAt);
    expect(bench.errors).toContainEqual(expect.objectContaining({ message: 'the disk is full' }));
    bench.store.fault = () => 'none';
    await bench.pass(60);
    expect(bench.driver.facts().state).toBe('stopped');
    expect(bench.store.kinds()).toEqual(expect.arrayContaining(['stop-requested', 'stopped']));
    expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
  });

  test('a run that another process drove on while this one wrote its journal is let go of; the journal stays', async () => {
    const bench = await away(await underWay(30));
    await bench.pass(10);
    bench.store.events.push({ seq: bench.store.events.length + 1, at: '', kind: 'server-restarted', data: {}, prev: '', hash: 'x' });
    bench.store.stored = JSON.stringify({ ...JSON.parse(bench.store.stored as string), chain: bench.store.events.at(-1) });
    back(bench, false);
    const told = bench.link.commands.length;
    await bench.pass(60);
    expect(bench.driver.isOver()).toBe(true);
    expect(bench.link.commands).toHaveLength(told);
    expect(await bench.journal.read()).not.toEqual([]);
  });

  test.each(['at once', 'after an outage'])(
    'what it refuses for good, %s, holds the run and is kept for the next process',
    async (when) => {
      const bench = await underWay(66, runStart({ ...shortProtocol, onInterruption: 'resume' }));
      const refusal = Object.assign(new Error('value too long for type character varying(8)'), { code: '22001' });
      if (when === 'after an outage') await away(bench);
      bench.store.fault = () => {
        throw refusal;
      };
      const answer = bench.driver.hold('Ben');
      await bench.pass(15);
      const [told, stoodAt, { writes }] = [bench.link.commands.length, bench.link.nowDeg(), bench.store];
      await bench.pass(60);
      expect([bench.link.commands.length, bench.link.nowDeg(), bench.store.writes]).toEqual([told, stoodAt, writes]);
      expect(bench.errors).toEqual([refusal]);
      expect([bench.driver.isOver(), answer.ok]).toEqual([true, true]);
      expect(await bench.driver.resume('Ben')).toMatchObject({ ok: false });
      bench.store.fault = () => 'none';
      await bench.restart(5);
      await bench.pass(60);
      expect(bench.driver.facts().state).toBe('held');
      expect(bench.store.kinds()).toContain('hold-requested');
      expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
    },
  );

  test('a resume that it refuses to save is answered', async () => {
    const bench = await underWay(20);
    bench.driver.hold('Ben');
    await bench.pass(5);
    bench.store.fault = () => {
      throw new Error('null value in column "kind" violates not-null constraint');
    };
    const answer = bench.driver.resume('Ben');
    await bench.pass(1);
    expect(await answer).toMatchObject({ ok: false, why: expect.stringContaining('no longer drives the run') });
    expect(sent(bench, 'move')).toHaveLength(1);
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
