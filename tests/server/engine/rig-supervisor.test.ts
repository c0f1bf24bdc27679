import { MemoryJournals } from '@/server/engine/memory-journal';
import { type QuarantinedRun, RigSupervisor, StartRefused } from '@/server/engine/rig-supervisor';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { isPassing } from '@/server/store/failures';
import type { Arm, Effect } from '@/server/engine/run-context';
import type { RunStart } from '@/shared/archive/run-records';
import type { RunStore, RunWrite, StoredRun } from '@/server/interfaces/run-store';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { FakeLink } from './fake-link';
import { MemoryStore, runStart, settle, sha256, shortProtocol, startUtcMs } from './rig-bench';

/** Several runs behind one store interface. */
class Runs implements RunStore {
  readonly byId = new Map<string, MemoryStore>();
  add(start: RunStart): RunStart {
    this.byId.set(start.runId, new MemoryStore(start));
    return start;
  }
  load = (_labId: string, runId: string): Promise<StoredRun | null> => this.byId.get(runId)?.load() ?? Promise.resolve(null);
  unfinished = async (): Promise<StoredRun[]> => (await Promise.all([...this.byId.values()].map((store) => store.unfinished()))).flat();
  commit = (write: RunWrite): Promise<void> => (this.byId.get(write.runId) as MemoryStore).commit(write);
}

interface Lab {
  clock: VirtualClock;
  links: Map<string, FakeLink>;
  runs: Runs;
  performed: Effect[];
  arms: Map<string, Arm>;
  journals: MemoryJournals;
  quarantined: QuarantinedRun[];
  newSupervisor(): RigSupervisor;
  make(more?: Partial<RunStart>): RunStart;
  north: FakeLink;
}

function makeLab(): Lab {
  const clock = new VirtualClock(startUtcMs, settle);
  const links = new Map(['north-bench', 'south-bench'].map((rigId) => [rigId, new FakeLink(clock)]));
  const runs = new Runs();
  const performed: Effect[] = [];
  const arms = new Map<string, Arm>(['north-bench', 'south-bench'].map((rigId) => [rigId, runStart().arm as Arm]));
  const journals = new MemoryJournals();
  const quarantined: QuarantinedRun[] = [];
  const newSupervisor = () =>
    new RigSupervisor({
      store: runs,
      journals,
      clock,
      sha256,
      linkOf: (rigId) => links.get(rigId) ?? null,
      guidedBy: () => null,
      armOf: (rigId) => arms.get(rigId) ?? null,
      whyDisarmed: () => '',
      lockedBy: () => null,
      perform: (effect) => performed.push(effect),
      isPassing,
      onQuarantine: (run) => quarantined.push(run),
    });
  const make = (more: Partial<RunStart> = {}) => runs.add(runStart(shortProtocol, more));
  return { clock, links, runs, performed, arms, journals, quarantined, newSupervisor, make, north: links.get('north-bench') as FakeLink };
}

const refusal = (start: () => unknown): StartRefused => {
  try {
    start();
  } catch (error) {
    if (error instanceof StartRefused) return error;
    throw error;
  }
  throw new Error('it was not refused');
};

test('one run to a rig: a second start is refused until the first is over, another rig is free', async () => {
  const lab = makeLab();
  const supervisor = lab.newSupervisor();
  supervisor.startRun(lab.make());
  await lab.clock.advance(10_000);
  expect(refusal(() => supervisor.startRun(lab.make({ runId: 'run-2' })))).toMatchObject({
    code: 'rig-busy',
    message: expect.stringContaining('another run'),
  });
  supervisor.startRun(lab.make({ runId: 'run-3', rigId: 'south-bench' }));
  expect(supervisor.driverOf('run-3')).toBe(supervisor.activeOf('south-bench'));
  await lab.clock.advance(300_000);
  expect(supervisor.activeOf('north-bench')).toBeNull();
  expect(supervisor.startRun(lab.make({ runId: 'run-4' })).facts().runId).toBe('run-4');
});

const refusedStarts: { when: string; more: Partial<RunStart>; code: string; words: string }[] = [
  { when: 'not armed', more: { arm: null }, code: 'not-armed', words: 'A named person on site has to arm it first' },
  {
    when: 'armed too short',
    more: { arm: { name: 'Ada Quill', untilUtcMs: startUtcMs + 60_000 } },
    code: 'not-armed',
    words: 'before the predicted finish',
  },
  {
    when: 'with an arm that is over',
    more: { arm: { name: 'Ada Quill', untilUtcMs: startUtcMs - 1 } },
    code: 'not-armed',
    words: 'not armed',
  },
  {
    when: 'to an unknown station',
    more: { protocol: { ...shortProtocol, steps: [{ kind: 'home' }, { kind: 'swing', to: 'nowhere' }] } },
    code: 'protocol-refused',
    words: 'nowhere',
  },
  {
    when: 'with a step that is not built',
    more: { protocol: { ...shortProtocol, steps: [{ kind: 'home' }, { kind: 'rotate', period_s: 1800, turns: 2 }] } },
    code: 'not-yet',
    words: 'rotate',
  },
  { when: 'on a rig without a link', more: { rigId: 'west-bench' }, code: 'not-ready', words: 'no link' },
];

test.each(refusedStarts)('a start $when is refused and nothing moves', async ({ more, code, words }) => {
  const lab = makeLab();
  const supervisor = lab.newSupervisor();
  const refused = refusal(() => supervisor.startRun(lab.make(more)));
  expect(refused.code).toBe(code);
  expect(refused.message).toContain(words);
  await lab.clock.advance(60_000);
  expect(lab.north.commands).toEqual([]);
});

test.each([
  ['the interlock is open', (link: FakeLink): void => void (link.interlockClosed = false), 'interlock'],
  ['the motor supply is off', (link: FakeLink): void => void (link.supplyPresent = false), 'supply'],
  ['the line is down', (link: FakeLink): void => void (link.up = false), 'not ready'],
] as const)('a start is refused while %s', (_, spoil, words) => {
  const lab = makeLab();
  spoil(lab.north);
  expect(refusal(() => lab.newSupervisor().startRun(lab.make()))).toMatchObject({
    code: 'not-ready',
    message: expect.stringContaining(words),
  });
});

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
  const unlike = Object.assign(new Error('Failed query: insert into …'), { cause: new Error('value too long for type character varying(8)') });
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

describe('a protocol that does not home', () => {
  const unhomed = { ...shortProtocol, steps: shortProtocol.steps.slice(1) };
  const start = (angleDeg: number | null, more: Partial<RunStart> = {}) => {
    const lab = makeLab();
    lab.north.angleDeg = angleDeg;
    return () => lab.newSupervisor().startRun(lab.make({ protocol: unhomed, ...more }));
  };

  test('starts where the controller knows its position', () => {
    expect(start(12)().runId).toBe('run-1');
  });

  test('is refused where it does not', () => {
    expect(refusal(start(null))).toMatchObject({ code: 'protocol-refused', message: expect.stringContaining('Put a home step') });
  });

  test('is refused where the way from where the sources stand meets an arc', () => {
    const rig = { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), keepOut: [[40, 60]] as [number, number][] } };
    expect(refusal(start(90, { rig })).findings).toEqual([expect.objectContaining({ code: 'keep-out', path: '1.swing' })]);
    expect(start(12, { rig })().runId).toBe('run-1');
  });

  test('a counted angle half a step of the motor beyond a limit is on it, one step beyond is not', () => {
    expect(start(175.011)().runId).toBe('run-1');
    expect(refusal(start(175.0225)).findings).toEqual([expect.objectContaining({ code: 'out-of-limits' })]);
  });
});

test('a repeat until a time that would go round too often from now on is refused at the start', () => {
  const lab = makeLab();
  const often: ProtocolDocument['steps'] = [
    { kind: 'home' },
    { kind: 'repeat', until: { localTime: '22:30' }, steps: [{ kind: 'dwell', for_s: 2 }] },
  ];
  // 22:00 UTC is 23:00 in Oslo: half past ten is almost a day ahead there.
  const protocol = { ...shortProtocol, steps: often };
  const arm = { name: 'Ada Quill', untilUtcMs: startUtcMs + 72 * 3_600_000 };
  expect(refusal(() => lab.newSupervisor().startRun(lab.make({ protocol, arm })))).toMatchObject({
    code: 'protocol-refused',
    findings: [expect.objectContaining({ code: 'too-many-steps', path: '2.repeat' })],
  });
  expect(lab.newSupervisor().startRun(lab.make({ protocol, arm, timeZone: 'UTC' })).runId).toBe('run-1');
});

test.each([
  ['hold', 'held'],
  ['resume', 'running'],
  ['stop', 'stopped'],
] as const)('at boot an unfinished run that says %s is %s', async (onInterruption, state) => {
  const lab = makeLab();
  const first = lab.newSupervisor();
  const seen: string[] = [];
  first.startRun(lab.make({ protocol: { ...shortProtocol, onInterruption } }));
  await lab.clock.advance(30_000);
  first.close();
  await lab.clock.advance(5_000);
  const second = lab.newSupervisor();
  second.onChange((_, { facts }) => seen.push(facts.state));
  await second.recover();
  expect([second.activeOf('north-bench')?.runId, lab.quarantined]).toEqual(['run-1', []]);
  await lab.clock.advance(2_000);
  expect(seen.at(-1)).toBe(state);
  const gapS = lab.runs.byId.get('run-1')?.events.find(({ kind }) => kind === 'server-restarted')?.data['gapS'];
  // The process writes down every 30 s that it lives, so the gap is known from above.
  expect(gapS).toBeGreaterThanOrEqual(5);
  expect(gapS).toBeLessThanOrEqual(35.1);
});

test('a run that was stored and never began is taken up by its protocol’s rule', async () => {
  const lab = makeLab();
  const start = lab.make();
  (lab.runs.byId.get('run-1') as MemoryStore).stored = JSON.stringify({
    start,
    snapshot: null,
    chartVersion: 1,
    chain: { seq: 0, hash: '0'.repeat(64) },
  });
  const supervisor = lab.newSupervisor();
  await supervisor.recover();
  const taken = supervisor.activeOf('north-bench');
  await lab.clock.advance(2_000);
  expect(taken?.facts().state).toBe('held');
  expect(lab.north.motions).toEqual([]);
  lab.arms.delete('north-bench');
  await taken?.resume('Ada Quill').then((answer) => expect(answer.ok).toBe(false));
  lab.arms.set('north-bench', { name: 'Ada Quill', untilUtcMs: startUtcMs + 3_600_000 });
  await taken?.resume('Ada Quill');
  await lab.clock.advance(300_000);
  expect(taken?.facts().state).toBe('finished');
});

test('a run of another chart version is quarantined: nothing is sent, and its rig stays blocked with a sentence', async () => {
  const lab = makeLab();
  const start = lab.make();
  (lab.runs.byId.get('run-1') as MemoryStore).stored = JSON.stringify({
    start,
    snapshot: { version: 99 },
    chartVersion: 99,
    chain: { seq: 0, hash: '0'.repeat(64) },
  });
  const supervisor = lab.newSupervisor();
  await supervisor.recover();
  expect(supervisor.activeOf('north-bench')).toBeNull();
  expect(lab.quarantined).toMatchObject([{ start: { runId: 'run-1' }, why: expect.stringContaining('another version') }]);
  expect(refusal(() => supervisor.startRun(lab.make({ runId: 'run-2' })))).toMatchObject({
    code: 'rig-busy',
    message: expect.stringContaining('unfinished run'),
  });
  await lab.clock.advance(60_000);
  expect(lab.north.commands).toEqual([]);
  await supervisor.giveUp('north-bench', 'Cleo');
  expect(lab.runs.byId.get('run-1')?.events).toMatchObject([{ seq: 1, kind: 'failed', data: { by: 'Cleo' } }]);
  expect(supervisor.startRun(lab.make({ runId: 'run-2' })).runId).toBe('run-2');
});
