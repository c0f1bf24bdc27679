import { shiftedBy, toRad, zeroOffset } from '@/components/runs/deflection-series';
import { nightPlan, plannedItems } from '@/components/runs/live-plan';
import { filterChoices, filterSteps, noFilter, outcomeOf } from '@/components/runs/step-filter';
import type { Step } from '@/shared/protocol/document';
import { planTimeline } from '@/shared/protocol/timeline';
import { leverOf, spotM } from '@/shared/physics/lever';
import type { StepRowView } from '@/shared/contracts/runs';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { nowUtcMs, protocol, rowsAt, startUtcMs, timeline, timeZone, viewAt } from '../fixtures/run';

const view = viewAt(nowUtcMs);
const items = plannedItems(view, timeZone);

test('the rest of the night follows the step that is going on, without a break and in full', () => {
  const rows = rowsAt(nowUtcMs);
  const { steps } = nightPlan('running', rows, items);
  expect(steps).toHaveLength(timeline.items.length);
  const future = steps.filter((step) => step.phase === 'planned');
  expect(future[0]?.startUtcMs).toBeCloseTo(steps[rows.length - 1]?.endUtcMs ?? 0, 3);
  expect(future.at(-1)?.station).toBe('clear');
});

test('a delay moves the rest of the night with it', () => {
  const rows = rowsAt(nowUtcMs).map((row, index, all) =>
    index === all.length - 1 ? { ...row, plannedEndUtcMs: (row.plannedEndUtcMs ?? 0) + 240_000 } : row,
  );
  const { steps } = nightPlan('running', rows, items);
  expect((steps.at(-1)?.endUtcMs ?? 0) - timeline.endUtcMs).toBeCloseTo(240_000, 3);
});

test('a dwell cut short by a hold is to be done again; a run that is over has no future', () => {
  const rows = rowsAt(nowUtcMs).map((row, index, all) =>
    index === all.length - 1 ? { ...row, endUtcMs: nowUtcMs, outcome: 'cut short' as const } : row,
  );
  const held = nightPlan('held', rows, items).steps;
  expect(held[rows.length]?.kind).toBe('dwell');
  expect(nightPlan('stopped', rows, items).steps).toHaveLength(rows.length);
});

test('a rotation that is going on leads to its end, and of one that is held only the rest is to come, then the way back', () => {
  const rig = { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), turnsLimit: 2 } };
  const steps: Step[] = [{ kind: 'rotate', period_s: 900, turns: 2 }];
  const turning = { ...view, rig, protocol: { ...protocol, steps }, startedAt: new Date(startUtcMs).toISOString() };
  const plan = plannedItems(turning, timeZone);
  const [template] = rowsAt(nowUtcMs);
  const row = { ...(template as StepRowView), kind: 'rotate' as const, path: '1.rotate.a', station: '', angleStartDeg: 0 };
  const running = { ...row, startUtcMs, plannedEndUtcMs: startUtcMs + 1_800_200, endUtcMs: null, angleEndDeg: null, outcome: null };
  expect(nightPlan('running', [running], plan).items[0]).toMatchObject({
    angleFromDeg: 0,
    angleToDeg: 720,
    speedDegS: expect.closeTo(0.4, 4),
  });
  const cut = { ...running, endUtcMs: startUtcMs + 1_350_000, angleEndDeg: 540, outcome: 'cut short' as const };
  const [, rest, back] = nightPlan('held', [cut], plan).items;
  expect(rest).toMatchObject({ path: '1.rotate.a', angleFromDeg: 540, angleToDeg: 720 });
  // Half a turn at 900 s a turn, and the ramps of 0.2 s.
  expect(((rest?.endUtcMs ?? 0) - (rest?.startUtcMs ?? 0)) / 1000).toBeCloseTo(450.2, 1);
  expect(back).toMatchObject({ path: '1.rotate.b', angleFromDeg: 720, angleToDeg: 0, startUtcMs: rest?.endUtcMs });
});

test('shuffled blocks to come are those of the run, in the order that its seed gives', () => {
  const block = (to: string): Step => ({
    kind: 'repeat',
    times: 1,
    steps: [
      { kind: 'swing', to },
      { kind: 'dwell', for_s: 60 },
    ] as Step[],
  });
  const blocks: Step = { kind: 'repeat', times: 6, order: 'shuffled', steps: ['near', 'far', 'clear'].map(block) };
  const shuffled = { ...protocol, steps: [{ kind: 'home' } as Step, blocks] };
  const pathsOf = (shuffleSeed: number) => plannedItems({ ...view, protocol: shuffled, shuffleSeed }, timeZone)?.map(({ path }) => path);
  for (const shuffleSeed of [1, 2, 3, 4_000_000_000]) {
    const plan = { protocol: shuffled, rig: demoRigWide, timeZone, shuffleSeed };
    expect(pathsOf(shuffleSeed)).toEqual(planTimeline(plan, { utcMs: startUtcMs, angleDeg: 0 }).items.map(({ path }) => path));
  }
  expect(pathsOf(2)).not.toEqual(pathsOf(1));
});

test('a run that has not started has no plan yet', () => {
  expect(plannedItems({ ...view, startedAt: null }, timeZone)).toBeNull();
});

test('a spot on the scale is turned back into the pendulum angle, also with an unknown zero', () => {
  const lever = leverOf(demoRigWide);
  if (lever === null) throw new Error('the demo rig has a lever');
  const spots = [-1e-3, 1e-3].map((rad) => spotM(rad, lever) * 1000 + 40);
  expect(Array.from(toRad(spots, 'mm', demoRigWide) ?? [])).toEqual([expect.closeTo(-1e-3, 9), expect.closeTo(1e-3, 9)]);
  expect(Array.from(toRad([250], 'urad', demoRigWide) ?? [])).toEqual([expect.closeTo(250e-6, 12)]);
  expect(toRad([1], 'degC', demoRigWide)).toBeNull();
});

test("the prediction is laid on the channel's own zero", () => {
  const x = Array.from({ length: 100 }, (_, index) => index);
  const predicted = { x, y: x.map((at) => Math.sin(at / 9)) };
  expect(zeroOffset(shiftedBy(predicted, 0.37), predicted)).toBeCloseTo(0.37, 12);
});

test('the log is filtered by kind, station and outcome, and offers what occurs', () => {
  const rows = rowsAt(nowUtcMs).map((row, index) => (index === 6 ? { ...row, good: false } : row));
  expect(filterChoices(rows)).toEqual({
    kind: ['dwell', 'home', 'settle', 'swing'],
    station: ['far', 'inline', 'near'],
    outcome: ['done', 'running', 'not good'],
  });
  expect(
    filterSteps(rows, { ...noFilter, kind: 'dwell', station: 'far' }).every((row) => row.kind === 'dwell' && row.station === 'far'),
  ).toBe(true);
  expect(filterSteps(rows, { ...noFilter, outcome: 'not good' }).map(outcomeOf)).toEqual(['done, not good']);
  expect(filterSteps(rows, { ...noFilter, outcome: 'running' })).toHaveLength(1);
});
