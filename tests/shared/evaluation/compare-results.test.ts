import { compareResults } from '@/shared/evaluation/compare-results';
import type { EvaluationResult } from '@/shared/evaluation/result';

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
  expect(compareResults(result, JSON.parse(JSON.stringify(result)) as EvaluationResult)).toEqual([]);
});

test('what differs is named with both values, each beside its u, and G comes first', () => {
  const other: EvaluationResult = {
    ...result,
    period_s: { value: 480.2, u: 0.2 },
    dwells: [dwell(2, 1e-4), dwell(4, 1.5e-3), { ...dwell(6, -1.5e-3), used: false, why: 'a door' }],
    G: { value: 6.675e-11, u: 2e-14, degreesOfFreedom: 9 },
  };
  const differences = compareResults(result, other);
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
