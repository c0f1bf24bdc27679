import { advance, beginRun, deadlineOf, isRunOver } from '@/server/engine/chart';
import type { ChartState, RunEvent, RunSnapshot } from '@/server/engine/run-context';
import type { ControllerState, LinkEvent } from '@/server/interfaces/turntable-link';
import type { InterruptionPolicy } from '@/shared/protocol/document';
import { runStart, shortProtocol, startUtcMs } from './rig-bench';

/**
 * The chart as a table: every event in every state, by the rules of the protocol format (hold, resume, stop, interruptions).
 */

const controller: ControllerState = {
  bootId: 'boot-1',
  firmware: 'fake',
  positionKnown: true,
  angleDeg: 0,
  moving: false,
  interlockClosed: true,
  supplyPresent: true,
  armKey: true,
  driversOn: true,
  homeFlagCovered: false,
  leaseLive: false,
  warningDue: false,
};
const at = (seconds: number) => ({ utcMs: startUtcMs + 1000 * seconds, uS: 0.0002 });
const heard = (link: LinkEvent): RunEvent => ({ type: `link.${link.kind}`, at: link.at, link }) as RunEvent;

const startWith = (onInterruption: InterruptionPolicy) => runStart({ ...shortProtocol, onInterruption });

/** The states of a run, reached as a run reaches them. */
function reach(state: ChartState, policy: InterruptionPolicy): { snapshot: RunSnapshot; now: number } {
  const start = startWith(policy);
  let snapshot = beginRun(start, startUtcMs);
  let now = 0;
  const give = (event: RunEvent) => {
    snapshot = advance(start, snapshot, event).snapshot;
  };
  const command = () => snapshot.context.step?.motion?.commandId ?? '';
  const begin = () => give({ type: 'begin', at: at(0), controller });
  const began = (angleDeg: number) => give(heard({ kind: 'motion-began', at: at((now += 1)), commandId: command(), angleDeg }));
  const homed = () => {
    begin();
    began(0);
    give(heard({ kind: 'homed', at: at((now += 1)), commandId: command(), angleDeg: 0 }));
    began(0);
  };
  const stood = () => {
    homed();
    give(heard({ kind: 'motion-ended', at: at((now += 5)), commandId: command(), angleDeg: 20.18, cause: 'done' }));
  };
  const routes: Partial<Record<ChartState, () => void>> = {
    starting: () => undefined,
    homing: () => {
      begin();
      began(0);
    },
    moving: homed,
    standing: stood,
    holding: () => {
      stood();
      give({ type: 'hold', at: at((now += 1)), by: 'Ben', acted: 'acted-1' });
    },
    held: () => {
      stood();
      give({ type: 'hold', at: at((now += 1)), by: 'Ben', acted: 'acted-1' });
      give(heard({ kind: 'standstill', at: at((now += 1)), commandId: 'acted-1', angleDeg: 20.18 }));
    },
    stopping: () => {
      stood();
      give({ type: 'stop', at: at((now += 1)), by: 'Ben', acted: 'acted-1' });
    },
    stopped: () => {
      stood();
      give({ type: 'stop', at: at((now += 1)), by: 'Ben', acted: 'acted-1' });
      give(heard({ kind: 'standstill', at: at((now += 1)), commandId: 'acted-1', angleDeg: 20.18 }));
    },
    interrupted: () => {
      stood();
      give(heard({ kind: 'lost', at: at((now += 1)), why: 'no valid reply for 5 s' }));
    },
    failed: () => {
      begin();
      give(heard({ kind: 'home-failed', at: at((now += 1)), commandId: command(), message: 'no edge within the travel' }));
    },
    finished: () => {
      stood();
      give({ type: 'deadline', at: at(65.1) });
      give({ type: 'deadline', at: at(66.6) });
      give(heard({ kind: 'motion-began', at: at(68), commandId: snapshot.context.ahead?.commandId ?? '', angleDeg: 20.18 }));
      give(heard({ kind: 'motion-ended', at: at(78), commandId: command(), angleDeg: -20.18, cause: 'done' }));
      give({ type: 'deadline', at: at(135.1) });
      give({ type: 'deadline', at: at(136.6) });
      give({ type: 'deadline', at: at(138) });
      now = 138;
    },
  };
  routes[state]?.();
  expect(snapshot.state).toBe(state);
  return { snapshot, now };
}

const states: ChartState[] = [
  'starting',
  'homing',
  'moving',
  'standing',
  'interrupted',
  'holding',
  'held',
  'stopping',
  'stopped',
  'finished',
  'failed',
];
const underWay = ['homing', 'moving', 'standing'] as const;

type Name =
  | 'hold'
  | 'stop'
  | 'hold-after-dwell'
  | 'resume'
  | 'lost'
  | 'reset'
  | 'interlock'
  | 'supply'
  | 'lease'
  | 'restart'
  | 'database'
  | 'database back'
  | 'ready'
  | 'ready, warning anew'
  | 'ready, position lost'
  | 'disarmed'
  | 'standstill'
  | 'stranger'
  | 'foreign';

function eventOf(name: Name, from: { snapshot: RunSnapshot; now: number }): RunEvent {
  const now = at(from.now + 1);
  const commandId = from.snapshot.context.step?.motion?.commandId ?? 'none';
  const events: Record<Name, RunEvent> = {
    hold: { type: 'hold', at: now, by: 'Ben', acted: 'acted-2' },
    stop: { type: 'stop', at: now, by: 'Ben', acted: 'acted-2' },
    'hold-after-dwell': { type: 'hold-after-dwell', at: now, by: 'Ben' },
    resume: { type: 'resume', at: now, by: 'Ben', arm: { name: 'Ada', untilUtcMs: startUtcMs + 3_600_000 } },
    lost: heard({ kind: 'lost', at: now, why: 'no valid reply for 5 s' }),
    reset: heard({ kind: 'reset', at: now, bootId: 'boot-2' }),
    interlock: heard({ kind: 'interlock', at: now, closed: false }),
    supply: heard({ kind: 'supply', at: now, present: false }),
    lease: heard({ kind: 'motion-ended', at: now, commandId, angleDeg: 10, cause: 'lease' }),
    restart: { type: 'server-restarted', at: now, aliveUtcMs: now.utcMs - 5000 },
    database: { type: 'database-away', at: now, sinceUtcMs: now.utcMs - 5000, acted: null },
    'database back': { type: 'database-back', at: now },
    ready: heard({ kind: 'ready', at: now, controller: { ...controller, angleDeg: 20.18 }, sameBoot: true, unheard: null }),
    'ready, warning anew': heard({
      kind: 'ready',
      at: now,
      controller: { ...controller, angleDeg: 20.18, warningDue: true },
      sameBoot: true,
      unheard: null,
    }),
    'ready, position lost': heard({
      kind: 'ready',
      at: now,
      controller: { ...controller, angleDeg: null, positionKnown: false },
      sameBoot: true,
      unheard: null,
    }),
    disarmed: { type: 'arm-ended', at: now, why: 'the arm key was turned off' },
    standstill: heard({ kind: 'standstill', at: now, commandId: 'acted-1', angleDeg: 20.18 }),
    stranger: heard({ kind: 'refused-controller', at: now, why: 'another major version' }),
    foreign: heard({ kind: 'motion-began', at: now, commandId: 'unknown', angleDeg: 3 }),
  };
  return events[name];
}

/** Next state under each policy; what is not named stays as it is. */
const byPolicy = (hold: ChartState, resume: ChartState, stop: ChartState) => ({ hold, resume, stop });
const always = (state: ChartState) => byPolicy(state, state, state);
const interruption = byPolicy('holding', 'interrupted', 'stopping');
const grave = byPolicy('holding', 'holding', 'stopping');

const expected: Partial<Record<Name, Partial<Record<ChartState, ReturnType<typeof byPolicy>>>>> = {
  hold: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, always('holding')])),
  stop: Object.fromEntries([...underWay, 'starting', 'interrupted', 'holding', 'held'].map((state) => [state, always('stopping')])),
  resume: { held: always('standing') },
  lost: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, interruption])),
  restart: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, interruption])),
  database: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, interruption])),
  reset: {
    ...Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, grave])),
    holding: always('held'),
    stopping: always('stopped'),
  },
  interlock: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, grave])),
  supply: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, grave])),
  lease: { homing: interruption, moving: interruption },
  ready: { starting: always('homing') },
  'ready, warning anew': { ...Object.fromEntries([...underWay, 'interrupted'].map((state) => [state, grave])), starting: always('homing') },
  'ready, position lost': { moving: grave, standing: grave, interrupted: grave, starting: always('homing') },
  disarmed: Object.fromEntries([...underWay, 'starting', 'interrupted'].map((state) => [state, always('holding')])),
  // In `interrupted` the line is down: what counts is the standstill after it is ready.
  standstill: { holding: always('held'), stopping: always('stopped') },
  stranger: { ...Object.fromEntries(underWay.map((state) => [state, interruption])), starting: always('failed') },
  foreign: { homing: always('holding'), moving: always('holding'), standing: always('holding') },
};

const names: Name[] = [
  'hold',
  'stop',
  'hold-after-dwell',
  'resume',
  'lost',
  'reset',
  'interlock',
  'supply',
  'lease',
  'restart',
  'database',
  'database back',
  'ready',
  'ready, warning anew',
  'ready, position lost',
  'disarmed',
  'standstill',
  'stranger',
  'foreign',
];
const policies: InterruptionPolicy[] = ['hold', 'resume', 'stop'];
const cells = policies.flatMap((policy) =>
  states
    .filter((state) => state !== 'interrupted' || policy === 'resume')
    .flatMap((state) => names.map((name) => ({ policy, state, name }))),
);

describe('every event in every state', () => {
  test.each(cells)('$policy: $name while $state', ({ policy, state, name }) => {
    const from = reach(state, policy);
    const { snapshot } = advance(startWith(policy), from.snapshot, eventOf(name, from));
    expect(snapshot.state).toBe(expected[name]?.[state]?.[policy] ?? state);
  });
});

test.each(cells)('$policy: $name while $state is a pure function of plain data', ({ policy, state, name }) => {
  const from = reach(state, policy);
  const before = JSON.stringify(from.snapshot);
  const once = advance(startWith(policy), from.snapshot, eventOf(name, from));
  const twice = advance(startWith(policy), JSON.parse(before) as RunSnapshot, eventOf(name, from));
  expect(JSON.stringify(from.snapshot)).toBe(before);
  expect(JSON.parse(JSON.stringify(once))).toEqual(once);
  expect(twice).toEqual(once);
});

test.each(states)('nothing is set in motion by any event once a run is %s', (state) => {
  if (!['holding', 'stopping', 'stopped', 'finished', 'failed'].includes(state)) return;
  for (const name of names) {
    const from = reach(state, 'hold');
    const { effects } = advance(startWith('hold'), from.snapshot, eventOf(name, from));
    expect(
      effects.filter((effect) => effect.kind === 'link' && (effect.command.kind === 'move' || effect.command.kind === 'home')),
    ).toEqual([]);
  }
});

test.each(['stopped', 'finished', 'failed'] as const)('a run that is %s waits for nothing', (state) => {
  const { snapshot } = reach(state, 'hold');
  expect(isRunOver(snapshot)).toBe(true);
  expect(deadlineOf(snapshot)).toBeNull();
});

test('a deadline that another event overtook means nothing', () => {
  const from = reach('holding', 'hold');
  const { snapshot } = advance(startWith('hold'), from.snapshot, { type: 'deadline', at: at(from.now + 2) });
  expect(snapshot).toBe(from.snapshot);
});
