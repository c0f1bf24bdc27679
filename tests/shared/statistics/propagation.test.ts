import { seededStreams, type GaussianSource } from '@/shared/physics/seeded-gaussian';
import { summarised } from '@/shared/evaluation/monte-carlo';
import { drawn, type Law } from '@/shared/statistics/draws';
import { equivalence } from '@/shared/statistics/equivalence';
import { studentTQuantile } from '@/shared/statistics/student-t';
import { relativeDifference } from '../../support/check-data';

/** Worked examples of JCGM 101:2008, 9 (expected values exact where a formula is given), and the test of equivalence of physics.md L1. */

/** Null is given where a distribution has no such moment: not here. */
function propagated(seed: number, model: (draw: (law: Law) => number) => number) {
  const [source] = seededStreams(seed, 1) as [GaussianSource];
  const { G_mean, G_u, interval95 } = summarised(
    Float64Array.from({ length: 200_000 }, () => model((law) => drawn(law, source))),
    [],
  );
  return { G_mean: G_mean ?? NaN, G_u: G_u ?? NaN, interval95: interval95 ?? [NaN, NaN] };
}

const normal: Law = { kind: 'normal' };
const rectangular: Law = { kind: 'rectangular' };
const sumOf = (draw: (law: Law) => number, laws: readonly [Law, number][]) => laws.reduce((sum, [law, u]) => sum + u * draw(law), 0);

test.each<[string, [Law, number][], number, number]>([
  ['four normal quantities (9.2.2)', Array.from({ length: 4 }, () => [normal, 1]), 2, 3.91992796908],
  ['four rectangular ones (9.2.3)', Array.from({ length: 4 }, () => [rectangular, 1]), 2, 2 * Math.sqrt(3) * (2 - 0.6 ** 0.25)],
  ['three rectangular ones and one ten times as wide (9.2.4)', [1, 1, 1, 10].map((u) => [rectangular, u]), Math.sqrt(103), 17.0],
])('the sum of %s', (_name, laws, u, half) => {
  const found = propagated(7, (draw) => sumOf(draw, laws));
  expect(relativeDifference(found.G_u, u)).toBeLessThan(0.006);
  expect(relativeDifference(found.interval95[1], half)).toBeLessThan(0.012);
  expect(relativeDifference(found.interval95[0], -half)).toBeLessThan(0.012);
});

test('mass calibration (9.3): the linear budget gives 0.0539 mg, the distributions 0.0754 mg', () => {
  // δm = (m_R + δm_R)[1 + (ρa − ρa0)(1/ρW − 1/ρR)] − m_nominal, kg and kg/m3; limits ± 0.1, ± 1000, ± 50.
  const found = propagated(3, (draw) => {
    const mass = 100_000 + 0.05 * draw(normal);
    const small = 1.234 + 0.02 * draw(normal);
    const air = 1.2 + (0.1 / Math.sqrt(3)) * draw(rectangular);
    const weight = 8000 + (1000 / Math.sqrt(3)) * draw(rectangular);
    const reference = 8000 + (50 / Math.sqrt(3)) * draw(rectangular);
    return (mass + small) * (1 + (air - 1.2) * (1 / weight - 1 / reference)) - 100_000;
  });
  expect(found.G_mean).toBeCloseTo(1.234, 3);
  expect(relativeDifference(found.G_u, 0.0754)).toBeLessThan(0.01);
  expect(found.interval95[0]).toBeCloseTo(1.083, 2);
  expect(found.interval95[1]).toBeCloseTo(1.383, 2);
});

test('the ends of the interval have the u that other trials show', () => {
  const ends = Array.from({ length: 60 }, (_, seed) => {
    const [source] = seededStreams(seed + 1, 1) as [GaussianSource];
    const { interval95, interval95_u } = summarised(
      Float64Array.from({ length: 4000 }, () => drawn(normal, source)),
      [],
    );
    return { end: interval95?.[1] ?? NaN, u: interval95_u?.[1] ?? NaN };
  });
  const mean = (of: (one: (typeof ends)[number]) => number) => ends.reduce((sum, one) => sum + of(one), 0) / ends.length;
  const middle = mean(({ end }) => end);
  const spread = Math.sqrt(mean(({ end }) => (end - middle) ** 2));
  // √(p(1 − p)/M) over the density at 1.96.
  expect(
    relativeDifference(
      mean(({ u }) => u),
      Math.sqrt((0.025 * 0.975) / 4000) / 0.0584451,
    ),
  ).toBeLessThan(0.05);
  expect(
    relativeDifference(
      mean(({ u }) => u),
      spread,
    ),
  ).toBeLessThan(0.25);
});

test.each([5, 12.5])('a mean from few repetitions has the spread √(ν/(ν − 2)) of Student, ν %d', (nu) => {
  expect(relativeDifference(propagated(11, (draw) => draw({ kind: 't', nu })).G_u, Math.sqrt(nu / (nu - 2)))).toBeLessThan(0.02);
});

test('a null that is shown and one that is merely not significant', () => {
  const values = [0.12, -0.08, 0.05, 0.21, -0.15, 0.02, -0.04, 0.09, 0.11, -0.06, 0.03, -0.01];
  const mean = values.reduce((sum, value) => sum + value, 0) / 12;
  const data = { value: mean, u: Math.sqrt(values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / 11 / 12), nu: 11 };
  expect(relativeDifference(data.u, 0.02882702681075)).toBeLessThan(1e-11);
  // The 90 % interval, and the bound at which the null is just shown is its further end.
  const half = studentTQuantile(0.95, 11) * data.u;
  expect(relativeDifference(mean - half, -0.02760335315113)).toBeLessThan(1e-9);
  expect(relativeDifference(mean + half, 0.07593668648446)).toBeLessThan(1e-9);
  expect([0.0759, 0.076].map((bound) => equivalence(data, bound).equivalent)).toEqual([false, true]);
  const shown = equivalence(data, 0.15);
  expect(relativeDifference(shown.p, 0.0005633291568629)).toBeLessThan(1e-9);
  expect(shown.equivalent).toBe(true);
  const notShown = equivalence(data, 0.06);
  expect(relativeDifference(notShown.p, 0.1198469289756)).toBeLessThan(1e-9);
  expect(notShown.equivalent).toBe(false);
});

test('an input of so few degrees of freedom that its distribution has no standard deviation, or no mean, gives none', () => {
  const { G_mean, G_u, interval95 } = summarised(
    Float64Array.from({ length: 100 }, (_, k) => k),
    [{ law: { kind: 't', nu: 2 }, u: 1 }],
  );
  expect([G_mean, G_u, interval95]).toEqual([49.5, null, [2, 97]]);
  expect(summarised(Float64Array.of(3, 4), [{ law: { kind: 't', nu: 1 }, u: 1 }])).toMatchObject({ G_mean: null, G_u: null });
  // Its u counts only where there is one.
  expect(summarised(Float64Array.of(3, 5), [{ law: { kind: 't', nu: 1 }, u: 0 }])).toMatchObject({ G_mean: 4, G_u: Math.SQRT2 });
});

test('one trial scatters not at all, and a few tell no interval', () => {
  expect(summarised(Float64Array.of(3), [])).toEqual({ trials: 1, G_mean: 3, G_u: null, interval95: null, interval95_u: null });
});
