import { abaDifference, countReversals, isAlternating, polynomialDifference, type SidedValue } from '@/shared/statistics/drift';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates } from '../../support/lcg';

function alternating(values: readonly number[], times: readonly number[] = values.map((_, k) => k)): SidedValue[] {
  return values.map((value, k) => ({ value, timeS: times[k] as number, side: k % 2 === 0 ? 1 : -1 }));
}
const costOf = (weights: readonly number[]) => (weights.length * weights.reduce((sum, w) => sum + w * w, 0)) / 4;
const zeros = (n: number) => new Array<number>(n).fill(0);

/** Check values of this block: independent computation in double precision. */
describe('the cost of removing drift', () => {
  test.each([
    { n: 4, aba: 1.25, first: 1.25, second: 1.25, third: null },
    { n: 5, aba: 1.25, first: 1.0416667, second: 1.3671875, third: 1.3671875 },
    { n: 6, aba: 1.21875, first: 1.09375, second: 1.09375, third: 1.4765625 },
    { n: 8, aba: 1.1666667, first: 1.05, second: 1.05, third: 1.203125 },
    { n: 10, aba: 1.1328125, first: 1.03125, second: 1.03125, third: 1.1171875 },
    { n: 16, aba: 1.081632653, first: 1.011904762, second: 1.011904762, third: 1.041418651 },
    { n: 30, aba: 1.042729592, first: 1.003348214, second: 1.003348214, third: 1.011293279 },
    { n: 48, aba: 1.026465028, first: 1.001304348, second: 1.001304348, third: 1.004367779 },
  ])('is as published for $n dwells (D2)', ({ n, aba, first, second, third }) => {
    const series = alternating(zeros(n));
    expect(relativeDifference(costOf(abaDifference(series).weights), aba)).toBeLessThan(5e-8);
    expect(relativeDifference(costOf(polynomialDifference(series, 1).weights), first)).toBeLessThan(5e-8);
    expect(relativeDifference(costOf(polynomialDifference(series, 2).weights), second)).toBeLessThan(5e-8);
    // Four dwells do not determine a cubic beside the difference.
    if (third === null) expect(polynomialDifference(series, 3).order).toBe(2);
    else expect(relativeDifference(costOf(polynomialDifference(series, 3).weights), third)).toBeLessThan(5e-8);
  });

  test('comes from the published weights', () => {
    const half = (weights: readonly number[]) => weights.map((w) => w / 2);
    half(polynomialDifference(alternating(zeros(4)), 1).weights).forEach((w, k) =>
      expect(w).toBeCloseTo(([1, -3, 3, -1][k] as number) / 8, 12),
    );
    half(polynomialDifference(alternating(zeros(5)), 1).weights).forEach((w, k) =>
      expect(w).toBeCloseTo(([2, -3, 2, -3, 2][k] as number) / 12, 12),
    );
    half(abaDifference(alternating(zeros(5))).weights).forEach((w, k) => expect(w).toBeCloseTo(([1, -3, 4, -3, 1][k] as number) / 12, 12));
  });
});

describe('windows of p + 2 dwells, which just determine a drift of order p', () => {
  /** Weights of half the difference. */
  const windowOf = (order: number) => polynomialDifference(alternating(zeros(order + 2)), order).weights.map((w) => w / 2);

  test.each([
    [0, [1, -1], 0.5],
    [1, [1, -2, 1], 0.375],
    [2, [1, -3, 3, -1], 0.3125],
    [3, [1, -4, 6, -4, 1], 0.2734375],
    [4, [1, -5, 10, -10, 5, -1], 0.24609375],
  ])('weigh by the binomial coefficients, p = %d (D1)', (order, binomial, variance) => {
    const weights = windowOf(order);
    weights.forEach((w, k) => expect(w).toBeCloseTo((binomial[k] as number) / 2 ** (order + 1), 11));
    expect(weights.reduce((sum, w) => sum + w * w, 0)).toBeCloseTo(variance, 11);
  });

  // Mean of all windows of orders 2 and 3.
  test.each([
    [4, 1.25, null],
    [5, 1.3671875, 1.3671875],
    [6, 1.375, 1.4765625],
    [8, 1.3, 1.453125],
    [10, 1.237244897959, 1.362847222222],
    [16, 1.142011834, 1.211805556],
    [30, 1.072530864, 1.105306953],
    [48, 1.044444444, 1.063791322],
  ])('cost the published amount, averaged over %d dwells (D2)', (n, second, third) => {
    for (const [order, published] of [
      [2, second],
      [3, third],
    ] as const) {
      if (published === null) continue;
      const windows = n - order - 1;
      const weights = zeros(n);
      for (let first = 0; first < windows; first += 1) {
        polynomialDifference(alternating(zeros(n)).slice(first, first + order + 2), order).weights.forEach((w, k) => {
          weights[first + k] = (weights[first + k] as number) + w / windows;
        });
      }
      expect(relativeDifference(costOf(weights), published)).toBeLessThan(1e-9);
    }
  });
});

describe('the difference of near and far', () => {
  const example = alternating([1.213, -1.187, 1.234, -1.168, 1.259, -1.141, 1.287, -1.115]);

  test('of the worked example is as published', () => {
    expect(relativeDifference(abaDifference(example).value / 2, 1.206583333333)).toBeLessThan(1e-11);
    expect(relativeDifference(polynomialDifference(example, 1).value / 2, 1.206625)).toBeLessThan(1e-11);
    expect(relativeDifference(polynomialDifference(example, 2).value / 2, 1.206625)).toBeLessThan(1e-11);
  });

  test('is free of a straight drift at unequal times, by either way', () => {
    const times = [0, 900, 1900, 2700, 5000, 5850, 6600];
    const series = alternating(
      times.map((t, k) => 0.4 + 3e-4 * t + (k % 2 === 0 ? 1.2 : -1.2)),
      times,
    );
    for (const found of [abaDifference(series), polynomialDifference(series, 1)]) {
      expect(found.value).toBeCloseTo(2.4, 12);
      expect(found.u).toBeLessThan(1e-12);
    }
  });

  test('by a polynomial is free of drift up to its order', () => {
    const values = Array.from({ length: 12 }, (_, k) => 0.5 + 0.3 * k - 0.02 * k ** 2 + 0.001 * k ** 3 + (k % 2 === 0 ? 1 : -1));
    expect(polynomialDifference(alternating(values), 3).value).toBeCloseTo(2, 11);
    expect(Math.abs(polynomialDifference(alternating(values), 1).value - 2)).toBeGreaterThan(1e-4);
  });

  test('needs no alternation by a polynomial, and is refused to ABA windows without it', () => {
    const series = alternating([1, -1, 1, -1, 1]).filter((_, k) => k !== 1);
    expect(isAlternating(series)).toBe(false);
    expect(countReversals(series)).toBe(2);
    expect(polynomialDifference(series, 1).value).toBeCloseTo(2, 12);
    expect(() => abaDifference(series)).toThrow('alternating');
  });

  test('of two or three dwells has a value and no uncertainty; of one side there is none', () => {
    const pair = polynomialDifference(alternating([1, -1]), 1);
    expect(pair).toMatchObject({ u: null, order: 0 });
    expect(pair.value).toBeCloseTo(2, 14);
    expect(abaDifference(alternating([1, -1, 1]))).toMatchObject({ value: 2, u: null, degreesOfFreedom: null });
    expect(() => polynomialDifference([{ timeS: 0, side: 1, value: 1 }], 1)).toThrow();
  });

  test('of four dwells has one degree of freedom and the same uncertainty by both ways', () => {
    const series = alternating([1, -1.1, 1.3, -0.9]);
    const [aba, ols] = [abaDifference(series), polynomialDifference(series, 1)];
    expect(aba.degreesOfFreedom).toBeCloseTo(1, 10);
    expect(ols.degreesOfFreedom).toBe(1);
    expect(aba.u).toBeCloseTo(ols.u as number, 12);
  });
});

describe('the uncertainty from the scatter of dwells', () => {
  /** Ratio of the mean square of u to the true variance, and the true spread of the difference, over many series. */
  function calibrate(walk: number, estimate: (series: SidedValue[]) => { value: number; u: number | null }) {
    const normal = normalDeviates(20260301);
    let [claimed, actual] = [0, 0];
    const trials = 3000;
    for (let trial = 0; trial < trials; trial += 1) {
      let zero = 0;
      const series = alternating(Array.from({ length: 24 }, (_, k) => (zero += walk * normal()) + normal() + (k % 2 === 0 ? 5 : -5)));
      const found = estimate(series);
      claimed += (found.u as number) ** 2 / trials;
      actual += (found.value - 10) ** 2 / trials;
    }
    return { ratio: claimed / actual, actual };
  }

  test('tells the true spread under white noise, by either way', () => {
    expect(Math.abs(calibrate(0, abaDifference).ratio - 1)).toBeLessThan(0.08);
    expect(Math.abs(calibrate(0, (series) => polynomialDifference(series, 1)).ratio - 1)).toBeLessThan(0.08);
  });

  test('is not blown up by a wandering zero that ABA windows remove', () => {
    const { ratio } = calibrate(1, abaDifference);
    expect(ratio).toBeGreaterThan(0.95);
    expect(ratio).toBeLessThan(1.5);
  });
});
