import { type Bench, anna, begun, nudge, refusal } from './guided-bench';
import { ABSENT_MS } from '@/server/engine/guided-moves';
import { longestNudgeSteps } from '@/server/engine/guided-orders';
import { demoRigNarrow } from '@/shared/rig/demo-rigs';
import { type RigMotion } from '@/shared/rig/document';

/** A guided first move: nudges, who may give them, and what ends them. */

describe('a nudge', () => {
  test('turns by exactly the microsteps asked, counter-clockwise for a positive number, and is counted', async () => {
    const { moves, asked, stay, state, angle } = await begun();
    moves.order(asked, nudge(80));
    expect(state()?.order).toMatchObject({ kind: 'nudge', steps: 80, state: 'sent' });
    await stay(6);
    expect(state()).toMatchObject({ order: { state: 'done', detail: '' }, count: { number: 1, steps: 80 } });
    expect(angle()).toBeCloseTo(80 / (16_000 / 360), 6);
    moves.order(asked, nudge(-30));
    await stay(4);
    expect(state()?.count.steps).toBe(50);
    expect(angle()).toBeCloseTo(50 / (16_000 / 360), 6);
  });

  test('works while the position is unknown, and is counted all the same', async () => {
    const { moves, asked, stay, state, link } = await begun(undefined, { homed: false, startDeg: 10 });
    expect(link.controller()?.positionKnown).toBe(false);
    moves.order(asked, nudge(40));
    await stay(4);
    expect(state()).toMatchObject({ order: { state: 'done' }, count: { steps: 40 } });
  });

  test('longer than a 36th of the travel is refused, as are 0 and parts of a step', async () => {
    const { moves, asked, rig, link } = await begun();
    // 350° of travel at 44.44 microsteps a degree: 15556 / 36, rounded up
    expect(longestNudgeSteps(rig.motion, link)).toBe(433);
    for (const steps of [434, -434, 0, 1.5])
      expect(refusal(() => moves.order(asked, nudge(steps)))).toMatchObject({ code: 'invalid-input', field: 'steps' });
  });

  test('enters a keep-out arc only when whoever orders it says so', async () => {
    const narrow = demoRigNarrow.motion as RigMotion;
    const { moves, asked, stay, state } = await begun(narrow, { startDeg: 30 });
    expect(refusal(() => moves.order(asked, nudge(-100)))).toMatchObject({
      code: 'not-possible-now',
      message: expect.stringContaining('the keep-out arc −29° to 29°'),
    });
    moves.order(asked, nudge(-50, true));
    await stay(4);
    expect(state()?.order?.state).toBe('done');
  });

  test.each([
    ['the rig is not armed', (bench: Bench) => void (bench.world.armed = false), 'not-armed', 'named person at the rig'],
    ['the arm key is off', (bench: Bench) => bench.turntable.turnArmKey(false), 'not-ready', 'arm key on the controller is off'],
    ['the interlock is open', (bench: Bench) => bench.turntable.openInterlock(), 'not-ready', 'interlock is open'],
    ['the supply is lost', (bench: Bench) => bench.turntable.loseSupply(), 'not-ready', 'supply is off'],
    ['a run has the rig', (bench: Bench) => void (bench.world.run = 'The rig is taken.'), 'rig-busy', 'taken'],
    ['the line is dead', (bench: Bench) => bench.turntable.dropLine(60_000), 'not-ready', 'does not answer'],
  ])('is refused while %s', async (_what, spoil, code, words) => {
    const bench = await begun();
    spoil(bench);
    await bench.stay(8);
    expect(refusal(() => bench.moves.order(bench.asked, nudge(20)))).toMatchObject({ code, message: expect.stringContaining(words) });
    expect(bench.moves.whyNot('north')).toContain(words);
  });

  test('is refused while the one before is under way, and to anybody else', async () => {
    const { moves, asked, stay } = await begun();
    moves.order(asked, nudge(200));
    await stay(1);
    expect(refusal(() => moves.order(asked, nudge(1)))).toMatchObject({
      code: 'not-possible-now',
      message: expect.stringContaining('under way'),
    });
    expect(refusal(() => moves.order({ ...asked, userId: 'u-other' }, nudge(1)))).toMatchObject({
      code: 'rig-busy',
      message: expect.stringContaining('Anna Fellstone'),
    });
    expect(refusal(() => moves.order({ ...asked, sessionId: 's-0' }, nudge(1)))).toMatchObject({ code: 'not-possible-now' });
  });
});

describe('nobody at the page', () => {
  test('for 2 s: the turntable is held, and nothing new is taken until the page answers again', async () => {
    const { clock, moves, asked, stay, state, angle } = await begun();
    moves.order(asked, nudge(400));
    await stay(2);
    expect(state()?.order?.state).toBe('moving');
    await clock.advance(ABSENT_MS + 1_500);
    const stoppedAt = angle();
    expect(state()?.order).toMatchObject({ state: 'cut short' });
    expect(moves.haltOf('north')).toMatchObject({
      kind: 'hold',
      by: expect.stringContaining('nobody was at the page'),
      confirmedAtUtcMs: expect.any(Number),
    });
    await clock.advance(5_000);
    expect(angle()).toBe(stoppedAt);
    expect(refusal(() => moves.order(asked, nudge(1)))).toMatchObject({
      message: expect.stringContaining('has not answered the server for 2 s'),
    });
    await stay(1);
    // how far it went is known, because the position is
    expect(state()?.count.steps).toBe(Math.round(stoppedAt * (16_000 / 360)));
    moves.order(asked, nudge(1));
  });

  test('for half a minute: the rig is free again', async () => {
    const { clock, moves } = await begun();
    await clock.advance(20_000);
    expect(moves.takenBy('north')).toContain('Anna Fellstone is at the guided first move of North bench');
    await clock.advance(15_000);
    expect(moves.of('north')).toBeNull();
    expect(moves.takenBy('north')).toBeNull();
  });

  test('beats that are old, or were never sent, prove nothing', async () => {
    const { clock, moves, asked } = await begun();
    await clock.advance(1_900);
    moves.seen(asked, clock.monotonicMs() - ABSENT_MS - 1);
    moves.seen(asked, clock.monotonicMs() + 10_000);
    await clock.advance(200);
    expect(moves.isPresent('north')).toBe(false);
  });
});

describe('hold and stop', () => {
  test('end a motion without a session of one’s own; a stop also voids the arm', async () => {
    const { clock, moves, asked, stay, state, world } = await begun();
    moves.order(asked, nudge(400));
    await stay(2);
    const halt = moves.halt({ labId: 'lab', rigId: 'north' }, 'stop', { id: 'u-viewer', name: 'Viewer' });
    expect(halt).toMatchObject({ kind: 'stop', by: 'Viewer', confirmedAtUtcMs: null });
    await stay(2);
    expect(state()?.order).toMatchObject({ state: 'cut short', detail: expect.stringContaining('arm the rig again') });
    expect(moves.haltOf('north')?.confirmedAtUtcMs).toBeLessThan(clock.utcMs());
    expect(world.ended).toEqual(['the turntable was stopped']);
    expect(refusal(() => moves.order(asked, nudge(1))).code).toBe('not-armed');
    world.armed = true;
    moves.order(asked, nudge(10));
    await stay(3);
    expect(state()?.order?.state).toBe('done');
  });

  test('a hold leaves the arm; the count goes on from where it stands', async () => {
    const { moves, asked, stay, state, world, angle } = await begun();
    moves.order(asked, nudge(400));
    await stay(2);
    moves.halt({ labId: 'lab', rigId: 'north' }, 'hold', anna);
    await stay(2);
    expect(world.armed).toBe(true);
    expect(state()).toMatchObject({ order: { state: 'cut short', detail: 'It was held.' }, count: { number: 1 } });
    expect(state()?.count.steps).toBe(Math.round(angle() * (16_000 / 360)));
  });
});

test('a move cut short while the position is unknown begins the count anew', async () => {
  const { moves, asked, stay, state } = await begun(undefined, { homed: false, startDeg: 10 });
  moves.order(asked, nudge(400));
  await stay(2);
  moves.halt({ labId: 'lab', rigId: 'north' }, 'hold', anna);
  await stay(2);
  expect(state()).toMatchObject({ order: { state: 'cut short' }, count: { number: 2, steps: 0 } });
});

test('one person at a time, and ending gives the rig free and holds what moves', async () => {
  const { moves, rig, asked, stay, state } = await begun();
  expect(refusal(() => moves.begin(rig, { id: 'u-2', name: 'Second' }, 's-2'))).toMatchObject({ code: 'rig-busy' });
  moves.order(asked, nudge(400));
  await stay(2);
  expect(state()?.order?.state).toBe('moving');
  moves.end('north', 's-1');
  await stay(2);
  expect(moves.haltOf('north')).toMatchObject({ kind: 'hold', confirmedAtUtcMs: expect.any(Number) });
  expect(moves.takenBy('north')).toBeNull();
});

test('limits are taught to the controller by whoever is at it', async () => {
  const { moves, asked, stay, link, world } = await begun();
  const limits = { leastDeg: -90, greatestDeg: 90, maxSpeedDegS: 3, maxAccelerationDegS2: 1, homeSpeedDegS: 0.5 };
  const answer = moves.teach(asked, limits);
  await stay(2);
  expect(await answer).toMatchObject({ taught: true });
  expect(link.limits()?.leastDeg).toBeCloseTo(-90, 1);
  world.armed = false;
  expect(refusal(() => moves.teach(asked, limits)).code).toBe('not-armed');
});
