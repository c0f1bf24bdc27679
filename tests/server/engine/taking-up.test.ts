import type { RunStart } from '@/shared/archive/run-records';
import { verifyChain } from '@/shared/archive/chain';
import { RigLostError } from '@/server/interfaces/run-store';
import { type MemoryStore, sha256, shortProtocol } from './rig-bench';
import { type Lab, makeLab, refusal } from './two-rigs';

/** A run that was held while the database was away; what it wrote lies in the journal of a process that is gone. */
async function leftInJournal(lab: Lab, more: Partial<RunStart> = {}): Promise<{ start: RunStart; store: MemoryStore }> {
  const [first, start] = [lab.newSupervisor(), lab.make(more)];
  first.startRun(start);
  await lab.clock.advance(20_000);
  const store = lab.runs.byId.get(start.runId) as MemoryStore;
  store.fault = () => 'away';
  first.activeOf(start.rigId)?.hold('Ben');
  await lab.clock.advance(5_000);
  first.close();
  expect(await lab.journals.of(start).read()).not.toEqual([]);
  return { start, store };
}

describe('a database that goes away again while the next process brings a journal in', () => {
  test('blocks no rig: the run is taken up when it is back, and until then no other starts there', async () => {
    const lab = makeLab();
    const { start, store } = await leftInJournal(lab);
    const head = store.events.length;
    const next = lab.newSupervisor();
    await next.recover();
    await lab.clock.advance(1_200_000);
    expect([next.activeOf(start.rigId), lab.quarantined]).toEqual([null, []]);
    expect(refusal(() => next.startRun(lab.make({ runId: 'run-2' })))).toMatchObject({
      code: 'rig-busy',
      message: expect.stringContaining('as soon as the database answers'),
    });
    store.fault = () => 'answer-lost';
    await lab.clock.advance(6_000);
    store.fault = () => 'none';
    await lab.clock.advance(8_000);
    expect(store.events.slice(head).map(({ kind }) => kind)).toContain('hold-requested');
    expect(next.activeOf(start.rigId)?.facts().state).toBe('held');
    expect(next.takenBy(start.rigId)).toContain('another run (held)');
  });

  test('keeps no other rig waiting', async () => {
    const lab = makeLab();
    await leftInJournal(lab);
    const other = lab.newSupervisor();
    other.startRun(lab.make({ runId: 'run-2', rigId: 'south-bench' }));
    await lab.clock.advance(20_000);
    other.close();
    const next = lab.newSupervisor();
    await next.recover();
    await lab.clock.advance(2_000);
    expect(next.activeOf('north-bench')).toBeNull();
    expect(next.activeOf('south-bench')?.facts().state).toBe('held');
  });

  test('leaves the rig alone for good once another process drives it', async () => {
    const lab = makeLab();
    const { start, store } = await leftInJournal(lab);
    const next = lab.newSupervisor();
    await next.recover();
    next.letGo(start.rigId);
    store.fault = () => 'none';
    const { writes } = store;
    await lab.clock.advance(60_000);
    expect([next.activeOf(start.rigId), next.takenBy(start.rigId), store.writes - writes]).toEqual([null, null, 0]);
  });
});

test('a journal that the database refuses blocks its rig at once, with a sentence, and no other', async () => {
  const lab = makeLab();
  const { start, store } = await leftInJournal(lab);
  const unlike = Object.assign(new Error('Failed query: insert into …'), {
    cause: new Error('value too long for type character varying(8)'),
  });
  store.fault = () => {
    throw unlike;
  };
  const other = lab.newSupervisor();
  other.startRun(lab.make({ runId: 'run-2', rigId: 'south-bench' }));
  await lab.clock.advance(20_000);
  other.close();
  const next = lab.newSupervisor();
  await next.recover();
  expect(lab.quarantined).toMatchObject([{ start: { runId: start.runId }, why: expect.stringContaining('value too long') }]);
  expect(next.takenBy(start.rigId)).toMatch(/blocked by an unfinished run.*value too long.*Look at the rig, then end the run\.$/);
  expect(next.activeOf('south-bench')?.runId).toBe('run-2');
});

describe('ending a run that could not be taken up', () => {
  async function quarantined(): Promise<{ lab: Lab; start: RunStart; store: MemoryStore; next: ReturnType<Lab['newSupervisor']> }> {
    const lab = makeLab();
    const { start, store } = await leftInJournal(lab);
    store.fault = () => {
      throw new Error('value too long for type character varying(8)');
    };
    const next = lab.newSupervisor();
    await next.recover();
    expect(next.quarantinedOf(start.rigId)).toMatchObject({ cause: 'broken', start: { runId: start.runId } });
    return { lab, start, store, next };
  }
  const open = (store: MemoryStore) => store.log().filter(({ outcome }) => outcome === null);

  test('what its journal kept goes into the log first; then its log says who ended it, and its open row fails', async () => {
    const { lab, start, store, next } = await quarantined();
    store.fault = () => 'none';
    expect(open(store)).toHaveLength(1);
    await lab.clock.advance(3_600_000);
    await next.giveUp(start.rigId, 'Cleo');
    expect(store.kinds()).toContain('hold-requested');
    expect(store.events.at(-1)).toMatchObject({
      kind: 'failed',
      at: new Date(lab.clock.utcMs()).toISOString(),
      data: { code: 'given-up', by: 'Cleo' },
    });
    expect(verifyChain(store.events, sha256).valid).toBe(true);
    expect(open(store)).toEqual([]);
    expect(await lab.journals.of(start).read()).toEqual([]);
    expect(next.takenBy(start.rigId)).toBeNull();
  });

  test('a journal that the database goes on refusing is set aside, and the run ends without it', async () => {
    const { lab, start, store, next } = await quarantined();
    store.fault = ({ events }) => {
      if (events.some(({ kind }) => kind === 'hold-requested')) throw new Error('value too long for type character varying(8)');
      return 'none';
    };
    await next.giveUp(start.rigId, 'Cleo');
    expect(store.events.at(-1)).toMatchObject({ kind: 'failed', data: { code: 'given-up' } });
    expect(open(store)).toEqual([]);
    expect(await lab.journals.of(start).read()).toEqual([]);
  });

  test('while the database is away nothing is ended, and the rig stays blocked', async () => {
    const { start, store, next } = await quarantined();
    store.fault = () => 'away';
    await expect(next.giveUp(start.rigId, 'Cleo')).rejects.toThrow('connection broke');
    expect(next.quarantinedOf(start.rigId)).not.toBeNull();
  });
});

test('a run that the database refuses to save blocks its rig, with a sentence, until somebody ends it; no other run notices', async () => {
  const lab = makeLab();
  const supervisor = lab.newSupervisor();
  const start = lab.make();
  supervisor.startRun(start);
  supervisor.startRun(lab.make({ runId: 'run-2', rigId: 'south-bench' }));
  await lab.clock.advance(20_000);
  (lab.runs.byId.get(start.runId) as MemoryStore).fault = () => {
    throw Object.assign(new Error('Failed query: insert into …'), { cause: new Error('value too long for type character varying(8)') });
  };
  await lab.clock.advance(120_000);
  expect(lab.quarantined).toMatchObject([{ start: { runId: start.runId }, why: expect.stringContaining('value too long') }]);
  expect([supervisor.activeOf(start.rigId), lab.north.mayRenew()]).toEqual([null, false]);
  expect(lab.north.commands.at(-1)).toMatchObject({ kind: 'hold' });
  expect(refusal(() => supervisor.startRun(lab.make({ runId: 'run-3' })))).toMatchObject({
    code: 'rig-busy',
    message: expect.stringMatching(/The run broke off and the turntable was held: value too long.*Look at the rig, then end the run\.$/),
  });
  expect(lab.runs.byId.get('run-2')?.kinds().at(-1)).toBe('finished');
  supervisor.release(start.rigId);
  expect(supervisor.takenBy(start.rigId)).toBeNull();
});

test('a process that has lost the rig while it brings a journal in keeps the journal, and asks again until it is told', async () => {
  const lab = makeLab();
  const { start, store } = await leftInJournal(lab);
  store.fault = () => {
    throw new RigLostError('another process has the rig');
  };
  const next = lab.newSupervisor();
  await next.recover();
  await lab.clock.advance(3_000);
  expect([next.activeOf(start.rigId), lab.quarantined]).toEqual([null, []]);
  expect(await lab.journals.of(start).read()).not.toEqual([]);
  store.fault = () => 'none';
  await lab.clock.advance(8_000);
  expect(next.activeOf(start.rigId)?.facts().state).toBe('held');
  expect(await lab.journals.of(start).read()).toEqual([]);
});

test('a frozen process that writes once more, after another has taken its rig over, leaves no run without a driver', async () => {
  const lab = makeLab();
  const [frozen, next] = [lab.newSupervisor(), lab.newSupervisor()];
  const start = lab.make({ protocol: { ...shortProtocol, onInterruption: 'resume' } });
  frozen.startRun(start);
  await lab.clock.advance(20_000);
  const { load } = lab.runs;
  lab.runs.load = async (...of) => {
    lab.runs.load = load;
    const found = await load(...of);
    // It wakes here: the other has read the run, and has not written yet.
    frozen.activeOf(start.rigId)?.holdAfterDwell('Ben');
    await frozen.idle();
    return found;
  };
  await next.recover();
  await lab.clock.advance(100);
  frozen.letGo(start.rigId);
  await lab.clock.advance(5_000);
  expect(next.activeOf(start.rigId)?.facts().state).toBe('running');
  const { events } = lab.runs.byId.get(start.runId) as MemoryStore;
  expect(events.map(({ kind }) => kind).slice(-4)).toEqual(['hold-after-dwell-requested', 'server-restarted', 'link-ready', 'resumed']);
  expect(verifyChain(events, sha256)).toMatchObject({ valid: true });
  await lab.clock.advance(60_000);
  expect(next.activeOf(start.rigId)?.facts()).toMatchObject({ state: 'held', reasonCode: 'hold-after-dwell' });
});

test('a process that finds its run driven by another, and is told then that the rig is lost, lets it be', async () => {
  const lab = makeLab();
  const [lost, next] = [lab.newSupervisor(), lab.newSupervisor()];
  const start = lab.make({ protocol: { ...shortProtocol, onInterruption: 'resume' } });
  lost.startRun(start);
  await lab.clock.advance(20_000);
  await next.recover();
  await lab.clock.advance(500);
  lost.activeOf(start.rigId)?.holdAfterDwell('Ben');
  await lab.clock.advance(500);
  expect(lost.activeOf(start.rigId)).toBeNull();
  lost.letGo(start.rigId);
  await lab.clock.advance(5_000);
  expect([lost.activeOf(start.rigId), next.activeOf(start.rigId)?.facts().state]).toEqual([null, 'running']);
});
