import { ABSENT_MS, GuidedMoves, GuidedRefused, longestNudgeSteps, type GuidedRig } from '@/server/engine/guided-moves';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { settle, startUtcMs } from './rig-bench';

/** A guided first move on the simulated controller, behind the same bytes as a real one. */

const anna = { id: 'u-anna', name: 'Anna Fellstone' };

async function makeBench(motion: RigMotion = demoRigWide.motion as RigMotion, start: { startDeg?: number; homed?: boolean } = {}) {
  const clock = new VirtualClock(startUtcMs, settle);
  const turntable = createSimulatedController({ clock, rig: motion, ...start });
  const link = createLink({ factory: turntable.factory, clock, rig: motion, epoch: 3 });
  const world = { armed: true, run: null as string | null, lock: null as string | null, ended: [] as string[] };
  const moves = new GuidedMoves({
    clock,
    linkOf: () => link,
    armOf: () => (world.armed ? { name: 'Anna Fellstone', untilUtcMs: startUtcMs + 3_600_000 } : null),
    takenBy: () => world.run,
    lockedBy: () => world.lock,
    endArm: (_rig, why) => {
      world.armed = false;
      world.ended.push(why);
    },
    onChange: () => undefined,
  });
  link.subscribe((event) => moves.heard('north', event));
  link.open();
  await clock.advance(3_000);
  const rig: GuidedRig = { labId: 'lab', rigId: 'north', name: 'North bench', document: { ...demoRigWide, motion }, motion };
  const asked = { rigId: 'north', sessionId: 's-1', userId: anna.id };
  /** Time goes by with the page open, which answers each beat of the stream after 120 ms. */
  const stay = async (seconds: number) => {
    for (let step = 0; step < seconds * 2; step += 1) {
      const beat = clock.monotonicMs();
      await clock.advance(120);
      if (moves.of('north') !== null) moves.seen(asked, beat);
      await clock.advance(380);
    }
  };
  const state = () => moves.of('north')?.state;
  return { clock, turntable, link, world, moves, rig, asked, stay, state, angle: () => turntable.trueAngleDegAt(clock.utcMs()) };
}

type Bench = Awaited<ReturnType<typeof makeBench>>;

async function begun(motion?: RigMotion, start?: { startDeg?: number; homed?: boolean }): Promise<Bench> {
  const bench = await makeBench(motion, start);
  bench.moves.begin(bench.rig, anna, 's-1');
  return bench;
}

const nudge = (steps: number, intoKeepOut = false) => ({ kind: 'nudge', steps, intoKeepOut }) as const;

const home = { kind: 'home', intoKeepOut: false } as const;

function refusal(act: () => unknown): GuidedRefused {
  try {
    act();
  } catch (error) {
    if (error instanceof GuidedRefused) return error;
    throw error;
  }
  throw new Error('it was not refused');
}

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

test('homing by hand finds the edge; passes of it are kept with their steps and direction', async () => {
  const { moves, asked, stay, state, link } = await begun(undefined, { homed: false, startDeg: 2 });
  moves.order(asked, home);
  await stay(15);
  expect(state()).toMatchObject({ order: { kind: 'home', state: 'done' }, edges: [{ steps: 0, direction: 'ccw' }] });
  expect(link.controller()).toMatchObject({ positionKnown: true, angleDeg: 0 });
  moves.order(asked, nudge(-40));
  await stay(4);
  expect(state()?.edges.at(-1)).toMatchObject({ direction: 'cw' });
});

test('a rig whose way to the edge may not be free homes only when somebody says that they look at it', async () => {
  const motion = { ...(demoRigNarrow.motion as RigMotion), homeDeg: 31 };
  const { moves, asked, stay, state, angle } = await begun(motion, { homed: false, startDeg: 33 });
  const before = angle();
  expect(moves.whyNot('north')).toBe('');
  expect(refusal(() => moves.order(asked, home))).toMatchObject({
    code: 'not-possible-now',
    message: expect.stringMatching(/does not home by itself: .* does not lie between near and far/),
  });
  await stay(4);
  expect(angle()).toBe(before);
  moves.order(asked, { ...home, intoKeepOut: true });
  await stay(30);
  expect(state()?.order).toMatchObject({ kind: 'home', state: 'done' });
});

test('a table that a rotation has left wound up is not homed, whoever looks, before nudges bring it back into its travel', async () => {
  const turning: RigMotion = { ...(demoRigWide.motion as RigMotion), turnsLimit: 2 };
  const { moves, asked, stay, link } = await begun(turning, { startDeg: 220 });
  for (const intoKeepOut of [false, true])
    expect(refusal(() => moves.order(asked, { ...home, intoKeepOut })).message).toMatch(
      /stands at 220\.005°, wound up .* by nudges first\.$/,
    );
  moves.order(asked, nudge(-longestNudgeSteps(turning, link)));
  await stay(120);
  expect(link.controller()?.angleDeg).toBeLessThan(175);
  expect(moves.order(asked, home).state.order).toMatchObject({ kind: 'home', state: 'sent' });
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
