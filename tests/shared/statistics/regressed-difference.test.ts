import { abaDifference, polynomialDifference, type SidedValue } from '@/shared/statistics/drift';
import { regressedDifference } from '@/shared/statistics/regressed-difference';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates } from '../../support/lcg';

const count = 16;
const normal = normalDeviates(5);
const x = Array.from({ length: count }, () => 20 + 0.3 * normal());
const noise = Array.from({ length: count }, () => 1e-6 * normal());
const seriesOf = (slope: number, noisy: number): SidedValue[] =>
  x.map((xi, k) => {
    const side = k % 2 === 0 ? 1 : -1;
    return { timeS: 840 * k, side, value: 2e-3 * side + 3e-9 * 840 * k + slope * xi + noisy * (noise[k] as number) };
  });
const aba = { kind: 'aba', order: 1 } as const;
const cubic = { kind: 'polynomial', order: 3 } as const;

test('without another quantity the difference, its u and its degrees of freedom are those of the drift models', () => {
  const series = seriesOf(0, 1);
  for (const [found, known] of [
    [regressedDifference(series, null, aba), abaDifference(series)],
    [regressedDifference(series, null, cubic), polynomialDifference(series, 3)],
  ] as const) {
    expect(found?.coefficient).toBeNull();
    expect(relativeDifference(found?.difference.value ?? NaN, known.value)).toBeLessThan(1e-12);
    expect(relativeDifference(found?.difference.u ?? NaN, known.u ?? NaN)).toBeLessThan(1e-9);
    expect(relativeDifference(found?.degreesOfFreedom ?? NaN, known.degreesOfFreedom ?? NaN)).toBeLessThan(1e-9);
  }
});

test.each([aba, cubic, { kind: 'gls', order: 1 } as const])('what goes with it is told and taken off, $kind', (drift) => {
  const found = regressedDifference(seriesOf(20e-6, 0), x, drift);
  expect(relativeDifference(found?.coefficient?.value ?? NaN, 20e-6)).toBeLessThan(1e-9);
  expect(relativeDifference(found?.difference.value ?? NaN, 4e-3)).toBeLessThan(1e-9);
});

// The pull (estimate − truth)/u over 400 series has a spread of 1 where u is right; t with about 8 degrees of freedom has √(8/6) = 1.15.
test.each([aba, cubic])('u of the coefficient and of the difference is their spread, $kind', (drift) => {
  const pulls = Array.from({ length: 400 }, () => {
    noise.forEach((_, k) => (noise[k] = 1e-6 * normal()));
    const found = regressedDifference(seriesOf(20e-6, 1), x, drift);
    if (found === null || found.coefficient === null) throw new Error('nothing was found');
    return [(found.coefficient.value - 20e-6) / found.coefficient.u, (found.difference.value - 4e-3) / found.difference.u];
  });
  for (const j of [0, 1]) {
    const rms = Math.sqrt(pulls.reduce((sum, pull) => sum + (pull[j] as number) ** 2, 0) / pulls.length);
    expect(rms).toBeGreaterThan(0.95);
    expect(rms).toBeLessThan(1.35);
  }
});

test.each<[string, readonly SidedValue[], number[]]>([
  ['that changes with the sides alone cannot be told from them', seriesOf(0, 1), x.map((_, k) => 20 + (k % 2))],
  ['that never changes tells nothing', seriesOf(0, 1), x.map(() => 20)],
  ['in five dwells leaves too little scatter', seriesOf(0, 1).slice(0, 5), x.slice(0, 5)],
])('a quantity %s', (_name, series, other) => {
  expect(regressedDifference(series, other, aba)).toBeNull();
});
