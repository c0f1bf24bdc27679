import { compareResults } from '@/shared/evaluation/compare-results';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const dwell = (seq: number, value: number) => ({
  seq,
  station: 'near',
  theta_rad: { value, u: 2e-7 },
  samples: 900,
  used: true,
  why: null,
});

const result: EvaluationResult = {
  formatVersion: 1,
  method: 'equilibrium',
  registered: true,
  chain: { events: 40, valid: true },
  alignment: null,
  period_s: { value: 480.2, u: 0.1 },
  decayTime_s: null,
  kappa_N_m: null,
  dwells: [dwell(4, 1.5e-3), dwell(6, -1.5e-3)],
  reversal_rad: { value: 3e-3, u: 3e-7, count: 1 },
  G: { value: 6.674e-11, u: 2e-14, degreesOfFreedom: 9 },
  relativeU: 3e-4,
  codata: { value: 6.6743e-11, u: 1.5e-15, En: -0.1 },
  budget: null,
  monteCarlo: null,
  warnings: [],
};

test('the same result, through JSON too, has no difference', () => {
  expect(compareResults(result, JSON.parse(JSON.stringify(result)) as EvaluationResult, demoRigWide)).toEqual([]);
});

test('what differs is named with both values, each beside its u, and G comes first', () => {
  const other: EvaluationResult = {
    ...result,
    period_s: { value: 480.2, u: 0.2 },
    dwells: [dwell(2, 1e-4), dwell(4, 1.5e-3), { ...dwell(6, -1.5e-3), used: false, why: 'a door' }],
    G: { value: 6.675e-11, u: 2e-14, degreesOfFreedom: 9 },
  };
  const differences = compareResults(result, other, demoRigWide);
  expect(differences[0]).toMatchObject({ path: 'G', before: { value: 6.674e-11, u: 2e-14 }, after: { value: 6.675e-11, u: 2e-14 } });
  expect(differences[0]?.change).toBeCloseTo(1e-14, 25);
  expect(differences[0]?.unit).toMatch(/^m³.kg⁻¹.s⁻²$/u);
  const byPath = new Map(differences.map((difference) => [difference.path, difference]));
  expect(byPath.get('period_s')).toMatchObject({ unit: 's', before: { u: 0.1 }, after: { u: 0.2 }, change: 0 });
  expect(byPath.get('dwells[6].used')).toMatchObject({ before: true, after: false, change: null });
  expect(byPath.get('dwells[6].why')).toMatchObject({ before: null, after: 'a door' });
  // One dwell more is told as that; the dwells behind it are not shifted against each other.
  expect(byPath.get('dwells[2].theta_rad')).toMatchObject({ unit: 'rad', before: null, after: { value: 1e-4, u: 2e-7 } });
  expect([...byPath.keys()].filter((path) => path.startsWith('dwells[4]'))).toEqual([]);
});

test('lines of the budget and coefficients of the surroundings have their units', () => {
  const line = (value: number) => ({ input: 'sources.mass', value, u: 0.001, sensitivity: 4e-11 / value, contribution: 1e-14, share: 1 });
  const pull = { reversal_rad: { value: 3e-3, u: 3e-7 }, G: null };
  const regression = (value: number) => ({
    ...{ channel: 'box', unit: 'Cel', dwells: 8, degreesOfFreedom: 6, without: pull, with: pull },
    coefficient: { value, u: 1e-6, unit: 'rad/Cel' },
  });
  const [one, other] = [1.5, 1.501].map((value) => ({ ...result, budget: [line(value)], regressions: [regression(value * 1e-5)] }));
  const differences = compareResults(one as EvaluationResult, other as EvaluationResult, demoRigWide);
  const unitOf = new Map(differences.map(({ path, unit }) => [path, unit]));
  expect(unitOf.get('budget[sources.mass]')).toBe('kg');
  expect(unitOf.get('budget[sources.mass].sensitivity')).toMatch(/^m³.kg⁻¹.s⁻² per kg$/u);
  expect(unitOf.get('regressions[box].coefficient')).toBe('rad/Cel');
});
