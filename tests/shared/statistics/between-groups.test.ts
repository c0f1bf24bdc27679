import { combined, momentVariance, withScatter, type Combined } from '@/shared/statistics/between-groups';
import { weightedMean } from '@/shared/statistics/weighted-mean';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates } from '../../support/lcg';

/** Values that scatter more than their u say (physics.md L4): an independent implementation. */

const paired = (values: readonly number[], us: readonly number[]) => values.map((value, k) => ({ value, u: us[k] as number }));
const toy = paired([6.62, 6.71, 6.68, 6.8, 6.59], [0.05, 0.04, 0.08, 0.06, 0.05]);
/** The measurements of G behind the CODATA values of 2018 and 2022, 1e-11 m3 kg-1 s-2, correlations left out (Tiesinga et al. 2021, Rev. Mod. Phys. 93, 025010). */
const codata = paired(
  [
    ...[6.67248, 6.6729, 6.67398, 6.674255, 6.67559, 6.67422, 6.67387, 6.67222],
    ...[6.67425, 6.67349, 6.67554, 6.67191, 6.67435, 6.674184, 6.674484, 6.6726],
  ],
  [
    ...[0.00043, 0.0005, 0.0007, 0.000092, 0.00027, 0.00098, 0.00027, 0.00087],
    ...[0.00012, 0.00018, 0.00016, 0.00099, 0.00013, 0.000078, 0.000077, 0.00025],
  ],
);

describe.each([
  {
    name: 'five invented values',
    values: toy,
    common: [6.675741501681, 0.02319300707],
    widenedU: 0.03519073001,
    // χ², checked for the second set in the tests of a published package for meta-analysis too.
    chiSquared: 9.20878688831,
    moments: [0.003662658095, 6.677183782643, 0.03647543375],
    searched: [0.0037393515, 6.677210115],
  },
  {
    name: 'sixteen measurements of G',
    values: codata,
    common: [6.67428983821, 3.758270097e-5],
    widenedU: 0.0001364895011,
    chiSquared: 197.839850347,
    moments: [3.079651085e-7, 6.673993492575, 0.0001640110955],
    searched: [9.2460896e-7, 6.673890381],
  },
])('$name', ({ values, common, widenedU, chiSquared, moments, searched }) => {
  const found = combined(values) as Combined;

  test('by their u alone, and that u widened', () => {
    expect(relativeDifference(found.common.mean, common[0] as number)).toBeLessThan(1e-11);
    expect(relativeDifference(found.common.u, common[1] as number)).toBeLessThan(1e-9);
    expect(relativeDifference(found.widenedU, widenedU)).toBeLessThan(1e-9);
    expect(relativeDifference(weightedMean(values).chiSquared, chiSquared)).toBeLessThan(1e-9);
  });

  test('with a scatter of their own by moments', () => {
    const variance = momentVariance(values);
    const { mean, u } = withScatter(values, variance);
    expect(relativeDifference(variance, moments[0] as number)).toBeLessThan(1e-8);
    expect(relativeDifference(mean, moments[1] as number)).toBeLessThan(1e-11);
    expect(relativeDifference(u, moments[2] as number)).toBeLessThan(1e-9);
  });

  test('with one that explains the scatter', () => {
    expect(relativeDifference(found.own.scatter ** 2, searched[0] as number)).toBeLessThan(1e-7);
    expect(relativeDifference(found.own.mean, searched[1] as number)).toBeLessThan(1e-9);
    const { chiSquared: left } = weightedMean(values.map(({ value, u }) => ({ value, u: Math.hypot(u, found.own.scatter) })));
    expect(left).toBeCloseTo(values.length - 1, 9);
  });
});

test('values that agree better than they say have no scatter of their own, and neither u grows', () => {
  const found = combined(paired([1, 1.001, 0.999], [0.1, 0.1, 0.1])) as Combined;
  expect(found.own).toMatchObject({ mean: found.common.mean, scatter: 0, scatterU: null });
  expect(found.own.u).toBeCloseTo(found.common.u, 15);
  expect(found.widenedU).toBe(found.common.u);
});

test('the u of the scatter is what many such sets show', () => {
  const normal = normalDeviates(5);
  const found = Array.from(
    { length: 400 },
    () => combined(Array.from({ length: 40 }, () => ({ value: Math.SQRT2 * normal(), u: 1 }))) as Combined,
  );
  const [scatters, us] = [found.map(({ own }) => own.scatter), found.map(({ own }) => own.scatterU ?? 0)];
  const mean = (values: readonly number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;
  const spread = Math.sqrt(mean(scatters.map((value) => (value - mean(scatters)) ** 2)));
  expect(relativeDifference(mean(us), spread)).toBeLessThan(0.15);
});

test('one value, or one without a u, is not combined', () => {
  expect(combined(paired([1], [0.1]))).toBeNull();
  expect(combined(paired([1, 2], [0.1, 0]))).toBeNull();
});
