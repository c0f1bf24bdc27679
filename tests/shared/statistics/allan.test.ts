import { allanDeviations, deviation, deviationSums, whiteVariance, type DeviationKind } from '@/shared/statistics/allan';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates, sp1065Uniforms } from '../../support/lcg';

/**
 * The worked examples of NIST SP 1065 (5.3 and 12.4, as quoted by three public test suites): its tables give 7 digits, an independent implementation the
 * others.
 */

const thousand = sp1065Uniforms(1000);
const nine = [892, 809, 823, 798, 671, 644, 883, 903, 677];

/** Not overlapping: of means over m, neighbours alone. */
function adev(values: readonly number[], m: number): number {
  const means = Array.from(
    { length: Math.floor(values.length / m) },
    (_, k) => values.slice(k * m, (k + 1) * m).reduce((a, b) => a + b, 0) / m,
  );
  return deviation(means, 1, 'allan');
}
/** Of phase, of values one a second. */
const tdev = (values: readonly number[], m: number) => (m * deviation(values, m, 'modified')) / Math.sqrt(3);
const of = (kind: DeviationKind) => (values: readonly number[], m: number) => deviation(values, m, kind);

test('the thousand values are those of the handbook', () => {
  expect(thousand.slice(1, 4).map((value) => Math.round(value * 2_147_483_647))).toEqual([395_529_916, 1_209_410_747, 633_705_974]);
  expect(Math.round((thousand[999] as number) * 2_147_483_647)).toBe(1_560_135_652);
  const mean = thousand.reduce((a, b) => a + b, 0) / 1000;
  const sd = Math.sqrt(thousand.reduce((sum, value) => sum + (value - mean) ** 2, 0) / 999);
  expect([mean, sd, Math.max(...thousand), Math.min(...thousand)].map((value) => Number(value.toPrecision(7)))).toEqual([
    0.4897745, 0.2884664, 0.9957453, 0.00137176,
  ]);
});

test.each<[string, (values: readonly number[], m: number) => number, number[], string[]]>([
  ['Allan', adev, [0.2922318781068, 0.09965736063175, 0.03897804330803], ['2.922319e-1', '9.965736e-2', '3.897804e-2']],
  ['overlapping Allan', of('allan'), [0.2922318781068, 0.09159953420119, 0.03241343026057], ['2.922319e-1', '9.159953e-2', '3.241343e-2']],
  ['modified Allan', of('modified'), [0.2922318781071, 0.0617237638245, 0.02170920913694], ['2.922319e-1', '6.172376e-2', '2.170921e-2']],
  ['time', tdev, [0.1687201534909, 0.3563623165947, 1.253381773911], ['1.687202e-1', '3.563623e-1', '1.253382e+0']],
  ['Hadamard', of('hadamard'), [0.2943883291241, 0.09581083173252, 0.03237638252761], ['2.943883e-1', '9.581083e-2', '3.237638e-2']],
  ['total', of('total'), [0.2922318781068, 0.09134743261701, 0.03406530252183], ['2.922319e-1', '9.134743e-2', '3.406530e-2']],
])('the %s deviation of a thousand values over 1, 10 and 100 of them', (_name, found, digits, table) => {
  [1, 10, 100].forEach((m, k) => {
    // What is printed is rounded once, and once differently in its last digit.
    expect(relativeDifference(found(thousand, m), digits[k] as number)).toBeLessThan(2e-12);
    expect(relativeDifference(found(thousand, m), Number(table[k]))).toBeLessThan(4e-7);
  });
});

test.each<[DeviationKind, number[]]>([
  ['allan', [999, 981, 801]],
  ['modified', [999, 972, 702]],
  ['hadamard', [998, 971, 701]],
  ['total', [999, 999, 999]],
])('%s: the number of differences', (kind, counts) => {
  expect([1, 10, 100].map((m) => deviationSums(thousand, m, kind).count)).toEqual(counts);
});

test.each<[string, (values: readonly number[], m: number) => number, number, number]>([
  ['Allan', adev, 91.22944974, 115.8082107],
  ['overlapping Allan', of('allan'), 91.22944974, 85.95286984],
  ['modified Allan', of('modified'), 91.22944974, 74.78849343],
  ['time', tdev, 52.67134737, 86.35831363],
  ['Hadamard', of('hadamard'), 70.80607319, 85.61487166],
  ['total', of('total'), 91.22944974, 93.90379053],
])('the %s deviation of the nine values of NBS Monograph 140 over one and two of them', (_name, found, one, two) => {
  expect(relativeDifference(found(nine, 1), one)).toBeLessThan(1e-9);
  expect(relativeDifference(found(nine, 2), two)).toBeLessThan(1e-9);
});

describe('the laws', () => {
  test('a straight drift of D shows as D m/√2, and not at all by Hadamard', () => {
    const straight = Array.from({ length: 200 }, (_, k) => 1e-3 * k);
    expect(deviation(straight, 10, 'allan')).toBeCloseTo(7.0710678118655e-3, 12);
    expect(deviation(straight, 10, 'hadamard')).toBeLessThan(1e-12);
  });

  test('white noise falls with the root of the time, a random walk of step s grows as s √((2m² + 1)/(6m)); the u holds', () => {
    const normal = normalDeviates(17);
    const noise = Array.from({ length: 20_000 }, normal);
    for (const kind of ['allan', 'modified', 'hadamard', 'total'] as const) {
      for (const m of [1, 4, 16, 64]) {
        const { sum, count, freedom } = deviationSums(noise, m, kind);
        const pull = (sum / count / whiteVariance(m, kind) - 1) * Math.sqrt(freedom / 2);
        expect(Math.abs(pull)).toBeLessThan(3);
      }
      expect(whiteVariance(16, kind)).toBeCloseTo(kind === 'modified' ? (16 ** 2 + 1) / (2 * 16 ** 3) : 1 / 16, 12);
    }
    let at = 0;
    const walk = noise.map((step) => (at += step));
    for (const m of [1, 8, 32])
      expect(relativeDifference(deviation(walk, m, 'allan'), Math.sqrt((2 * m * m + 1) / (6 * m)))).toBeLessThan(0.15);
  });

  // Table 5 of SP 1065, white frequency noise: from memory.
  test.each([1, 4, 30])('%d averaged: the degrees of freedom are near the handbook’s approximation', (m) => {
    const phases = 1001;
    const table = ((3 * (phases - 1)) / (2 * m) - (2 * (phases - 2)) / phases) * ((4 * m * m) / (4 * m * m + 5));
    expect(relativeDifference(deviationSums(thousand, m, 'allan').freedom, table)).toBeLessThan(0.02);
  });
});

test('averaging times go on in octaves, up to where two differences are left', () => {
  expect(allanDeviations(thousand.slice(0, 64), 30).map(({ tau_s }) => tau_s)).toEqual([30, 60, 120, 240, 480]);
});

test('too short a series has no deviation', () => {
  expect(deviation([1, 2, 3], 2, 'hadamard')).toBeNaN();
  expect(deviation([1], 1, 'total')).toBeNaN();
  expect(allanDeviations([1, 2], 10)).toEqual([]);
});
