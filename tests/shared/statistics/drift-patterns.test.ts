import { abaDifference, polynomialDifference, type SidedValue } from '@/shared/statistics/drift';
import { walkFit } from '@/shared/statistics/gls-drift';
import { relativeDifference } from '../../support/check-data';

/** Orders of near and far against drift and against a zero that walks (physics.md D4, J1): values of an independent implementation. */

/** +1 and −1 by turns, in the order of Thue and Morse, or as ABBA over and over. */
const patterns = {
  ABAB: (k: number) => k % 2 === 0,
  ABBA: (k: number) => k % 4 === 0 || k % 4 === 3,
  TM: (k: number) => k.toString(2).split('1').length % 2 === 1,
};
type Pattern = keyof typeof patterns;

const seriesOf = (pattern: Pattern, count: number, valueOf: (k: number) => number = () => 0, lengthS = 0): SidedValue[] =>
  Array.from({ length: count }, (_, k) => ({ timeS: 1000 * k, side: patterns[pattern](k) ? 1 : -1, value: valueOf(k), lengthS }));

test.each<[string, Pattern, number, number[]]>([
  ['ABAB removes a constant alone', 'ABAB', 4, [0, -2]],
  ['ABBA a straight drift', 'ABBA', 4, [0, 0, 4, 18, 64]],
  ['eight dwells of Thue and Morse one of the second order', 'TM', 8, [0, 0, 0, -48, -672]],
  ['sixteen one of the third', 'TM', 16, [0, 0, 0, 0, 1536]],
])('by plain means %s', (_name, pattern, count, moments) => {
  moments.forEach((moment, order) => {
    const { value } = polynomialDifference(
      seriesOf(pattern, count, (k) => k ** order),
      0,
    );
    // Mean of one side less that of the other is twice the sum of side · value over the number of dwells.
    expect((value * count) / 2).toBeCloseTo(moment, 7);
  });
});

test.each<[Pattern, number]>([
  ['ABAB', 15],
  ['ABBA', 8],
  ['TM', 10],
])('%s takes %d moves in sixteen dwells', (pattern, moves) => {
  const series = seriesOf(pattern, 16);
  expect(series.slice(1).filter(({ side }, k) => side !== series[k]?.side)).toHaveLength(moves);
});

describe('48 dwells of 900 s, one every 1000 s, whose zero walks', () => {
  // Variance of the walk in a cycle over that of a dwell's own noise.
  test.each<[number, Record<Pattern, number>]>([
    [0.1, { ABAB: 1.0133, ABBA: 1.035, TM: 1.0332 }],
    [1, { ABAB: 1.111, ABBA: 1.35, TM: 1.284 }],
    [10, { ABAB: 2.05, ABBA: 4.5, TM: 3.3 }],
  ])('by %d times its noise: the costs of the three orders', (ratio, costs) => {
    for (const [pattern, published] of Object.entries(costs) as [Pattern, number][]) {
      const found = (48 * walkFit(seriesOf(pattern, 48, undefined, 900), ratio).unitVariance) / 4;
      expect(relativeDifference(found, published)).toBeLessThan(2e-3);
    }
  });

  const series = seriesOf('ABAB', 48, undefined, 900);
  /** Variance of half a weighted difference by what a walk does to means over dwells, times their number. */
  const costOf = (weights: readonly number[], ratio: number) => {
    const perS = ratio / 1000;
    const shared = (i: number, j: number) => (i === j ? 1 + perS * (1000 * i + 300) : perS * (1000 * Math.min(i, j) + 450));
    return (weights.length / 4) * weights.reduce((sum, a, i) => sum + weights.reduce((own, b, j) => own + a * b * shared(i, j), 0), 0);
  };
  const ways: [string, () => readonly number[], number, number | null][] = [
    ['generalised least squares', () => walkFit(series, 10).estimate.weights, 2.048, null],
    ['windows of three', () => abaDifference(series).weights, 2.067, 1.026],
    ['a cubic', () => polynomialDifference(series, 3).weights, 2.288, 1.004],
    ['a straight line', () => polynomialDifference(series, 1).weights, 2.503, null],
    ['plain means', () => polynomialDifference(series, 0).weights, 4.5, 1],
  ];

  test.each(ways)('are evaluated by %s at its published cost, walking and still', (_name, weights, walking, still) => {
    expect(relativeDifference(costOf(weights(), 10), walking)).toBeLessThan(2e-3);
    if (still !== null) expect(relativeDifference(costOf(weights(), 0), still)).toBeLessThan(1e-3);
  });
});

// Lengths and intervals in s, N · variance over that of the walk in a second: with 400 dwells, and for ever more of them.
test.each([
  [900, 1000, 100.397, 100],
  [1000, 1000, 83.696, 83.333],
  [900, 1320, 180.611, 180],
])(
  'where nothing but the walk is, dwells of %d s every %d s cost %d, towards (3 t_c − 2 t_d)/12 = %d',
  (dwellS, cycleS, published, limit) => {
    expect((3 * cycleS - 2 * dwellS) / 12).toBeCloseTo(limit, 2);
    const series = Array.from({ length: 400 }, (_, k): SidedValue => ({
      timeS: cycleS * k,
      side: k % 2 === 0 ? 1 : -1,
      value: 0,
      lengthS: dwellS,
    }));
    const ratio = 1e8;
    const found = ((400 * walkFit(series, ratio).unitVariance) / 4 / ratio) * cycleS;
    expect(relativeDifference(found, published)).toBeLessThan(1e-4);
  },
);
