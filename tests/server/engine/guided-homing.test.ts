import { anna, begun, home, makeBench, nudge, refusal } from './guided-bench';
import { longestNudgeSteps } from '@/server/engine/guided-orders';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { type RigMotion } from '@/shared/rig/document';

/** Homing by a person at the rig. */

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

test('homing that meets no edge of the flag is held after the time that the whole way takes, and says so', async () => {
  const slow = demoRigWide.motion as RigMotion;
  const bench = await makeBench({ ...slow, homeSpeed_deg_s: 0.05 }, { homed: false, startDeg: 40 });
  // By its document this rig homes 20 times faster than the controller does: the edge is not met in time.
  const { moves, asked, stay, state } = bench;
  moves.begin({ ...bench.rig, motion: { ...slow, homeSpeed_deg_s: 1 } }, anna, 's-1');
  moves.order(asked, home);
  const wholeWayS = 2 * (slow.maxDeg - slow.minDeg);
  await stay(wholeWayS + 10);
  expect(state()?.order).toMatchObject({ state: 'moving' });
  await stay(20);
  expect(state()?.order).toMatchObject({ state: 'cut short' });
  expect(moves.haltOf('north')).toMatchObject({ kind: 'hold', by: expect.stringContaining('edge of the home flag was not found') });
  // One that ended in time leaves no late hold behind it.
  moves.order(asked, nudge(4));
  await stay(5);
  expect(state()?.order).toMatchObject({ kind: 'nudge', state: 'done' });
}, 60_000);

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
