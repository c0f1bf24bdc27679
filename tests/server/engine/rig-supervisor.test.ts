import type { RunStart } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import type { FakeLink } from './fake-link';
import { type MemoryStore, shortProtocol, startUtcMs } from './rig-bench';
import { makeLab, refusal } from './two-rigs';

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
  expect(lab.runs.byId.get('run-1')?.events).toMatchObject([{ seq: 1, kind: 'failed', data: { code: 'given-up', by: 'Cleo' } }]);
  expect(JSON.parse((lab.runs.byId.get('run-1') as MemoryStore).stored ?? '')).toMatchObject({
    snapshot: { version: 99 },
    chartVersion: 99,
  });
  expect(supervisor.startRun(lab.make({ runId: 'run-2' })).runId).toBe('run-2');
});
