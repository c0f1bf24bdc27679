import { budgetFirst, predictedSignalU } from '@/shared/planning/budget-first';
import { predictSignal } from '@/shared/protocol/predict';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { withRig } from '../../support/reference-rigs';

const budgetOf = (rig: RigDocument) => {
  const budget = budgetFirst(rig);
  if (budget === null) throw new Error('this rig has a budget');
  return budget;
};

test('the orbit of the sources leads on the demo rig, and halving its u does what the next budget says', () => {
  const { relativeU, measurements } = budgetOf(demoRigWide);
  expect(measurements[0]?.source).toBe('sources.orbit');
  expect(measurements.map(({ relativeU: u }) => u)).toEqual(measurements.map(({ relativeU: u }) => u).sort((a, b) => b - a));
  expect(measurements.reduce((sum, { share }) => sum + share, 0)).toBeCloseTo(1, 12);
  // Twice as well measured in the rig itself, not by the shortcut.
  for (const [index, halve] of [
    (r: RigDocument) => void Object.assign(r.sources.orbit as object, { u: (r.sources.orbit?.u ?? 0) / 2 }),
    (r: RigDocument) => void (r.pendulum.arm.u /= 2),
  ].entries()) {
    const better = budgetOf(withRig(demoRigWide, halve));
    const source = ['sources.orbit', 'pendulum.arm'][index];
    const promised = measurements.find((one) => one.source === source)?.relativeUIfHalved ?? NaN;
    expect(better.relativeU / promised).toBeCloseTo(1, 6);
    expect(better.relativeU).toBeLessThan(relativeU);
  }
});

test('at the greatest torque an angle counts by its square: half its u is a quarter of its part', () => {
  // With nothing else uncertain the station is all there is.
  const rig = withRig(demoRigWide, (r) => {
    const still = (node: unknown): void => {
      if (typeof node !== 'object' || node === null) return;
      if ('u' in node) node.u = 0;
      Object.values(node).forEach(still);
    };
    still(r);
    r.stations.near = { value: 20.1808283867, u: 0.5, unit: 'deg' };
  });
  const { relativeU, measurements } = budgetOf(rig);
  expect(measurements.map(({ source }) => source)).toEqual(['stations.near']);
  // The pendulum stands a fifteenth of a degree out of its rest line, so not quite at the top.
  const ratio = (measurements[0]?.relativeUIfHalved ?? NaN) / relativeU;
  expect(ratio).toBeGreaterThan(0.24);
  expect(ratio).toBeLessThan(0.29);
});

test('no night makes it smaller, and what shares its error stands together', () => {
  const rig = withRig(demoRigWide, (r) => {
    r.pendulum.arm.group = 'ruler';
    Object.assign(r.sources.orbit as object, { group: 'ruler' });
  });
  const { measurements } = budgetOf(rig);
  expect(measurements[0]).toMatchObject({ source: 'group ruler', inputs: ['pendulum.arm', 'sources.orbit'] });
  // Longer by the same share, arm and orbit hardly change the ratio that G hangs on, so together they leave less than the orbit alone.
  expect(measurements[0]?.relativeU).toBeLessThan(budgetOf(demoRigWide).measurements[0]?.relativeU ?? NaN);
});

test('a rig without sources, without a measured period or without any u has none', () => {
  expect(budgetFirst(withRig(demoRigWide, (r) => void (r.sources = { shape: 'none', count: 2 })))).toBeNull();
  expect(budgetFirst(withRig(demoRigWide, (r) => delete r.measured))).toBeNull();
});

describe.each([
  ['wide', demoRigWide],
  ['close', demoRigNarrow],
])('the predicted near minus far of the %s demo rig', (_name, rig) => {
  interface Known {
    value: number;
    u: number;
  }
  const quantities = (node: unknown): Known[] =>
    typeof node !== 'object' || node === null
      ? []
      : 'u' in node && 'value' in node
        ? [node as Known]
        : Object.values(node).flatMap(quantities);

  test.each([
    ['angle', 'signalRad'],
    ['onScale', 'signalM'],
  ] as const)('has, as %s, the u that comes of moving each quantity of the document by its u', (which, of) => {
    const parts = (['pendulum', 'sources', 'stations', 'lever', 'measured'] as const).filter((part) => rig[part] !== undefined);
    const signal = predictSignal(rig)?.[of] ?? NaN;
    const moved = parts.flatMap((part) =>
      quantities(rig[part]).map((_, k) => {
        const at = (side: 1 | -1) =>
          predictSignal(
            withRig(rig, (r) => {
              const one = quantities(r[part])[k] as Known;
              one.value += side * one.u;
            }),
          )?.[of] ?? NaN;
        return (at(1) - at(-1)) / 2 / signal;
      }),
    );
    expect(Math.hypot(...moved) / (predictedSignalU(rig)?.[which] ?? NaN)).toBeCloseTo(1, 1);
    expect(Math.hypot(...moved)).toBeGreaterThan(1e-3);
  });
});
