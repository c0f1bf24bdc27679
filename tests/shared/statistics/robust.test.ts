import { biweight, biweightSlope, huberSlope, huberWeight } from '@/shared/statistics/robust';

/**
 * Of normal residuals an estimate by ψ(z) = z w(z) has the variance E ψ² / (E ψ′)² (Huber 1981, 3.2, from memory), which the limits 1.345 and
 * 4.685 are chosen to make 1/0.95 (physics.md C7).
 */
function expectation(f: (z: number) => number): number {
  const step = 1e-3;
  let sum = 0;
  for (let z = -9 + step / 2; z < 9; z += step) sum += (f(z) * Math.exp((-z * z) / 2) * step) / Math.sqrt(2 * Math.PI);
  return sum;
}

test.each([
  ['Huber', huberWeight, huberSlope],
  ['the biweight', biweight, biweightSlope],
])('%s is 95 %% as good as the mean, with the slope of its weighted residual', (_name, weight, slope) => {
  const variance = expectation((z) => (z * weight(z)) ** 2) / expectation(slope) ** 2;
  expect(Math.abs(1 / variance - 0.95)).toBeLessThan(1e-4);
  // By its weights alone it would seem better than the mean, which nothing is.
  expect(expectation((z) => (z * weight(z)) ** 2) / expectation(weight) ** 2).toBeLessThan(1);
});
