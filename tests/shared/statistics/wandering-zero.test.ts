import { abaDifference, type SidedValue } from '@/shared/statistics/drift';
import { walkDifference } from '@/shared/statistics/gls-drift';
import { enoughForWalk, walkScatter } from '@/shared/statistics/wandering-zero';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates } from '../../support/lcg';

const [cycleS, dwellS] = [840, 820];

/** Dwells near and far by turns of no difference: noise of 1 each beside a walk that gains a variance of `walk` over a cycle. */
function series(count: number, walk: number, normal: () => number): SidedValue[] {
  const perS = Math.sqrt(walk / cycleS);
  let zero = 0;
  return Array.from({ length: count }, (_, k) => {
    // The mean of a walk over a dwell: half of what it gains, and an independent part of variance length/12.
    const gain = Math.sqrt(dwellS) * normal();
    const mean = zero + perS * (gain / 2 + Math.sqrt(dwellS / 12) * normal());
    zero += perS * (gain + Math.sqrt(cycleS - dwellS) * normal());
    return { timeS: cycleS * k, side: k % 2 === 0 ? 1 : -1, value: mean + normal(), lengthS: dwellS };
  });
}

const rms = (values: readonly number[]) => Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length);

describe('over 400 nights of 48 dwells the stated u is as great as the error', () => {
  test.each([
    [0, 1],
    [10, 1.21],
    [1000, 1.4],
  ])('with a walk of %d times the noise, where the windows alone say %f times as much', (walk, windowsSay) => {
    const normal = normalDeviates(20 + walk);
    const nights = Array.from({ length: 400 }, () => {
      const night = series(48, walk, normal);
      const { value, weights, u } = abaDifference(night);
      return { error: value, windows: u ?? NaN, u: walkScatter(night, weights)?.u ?? NaN };
    });
    const error = rms(nights.map((night) => night.error));
    // 400 errors tell their rms to 3.5 %.
    expect(Math.abs(rms(nights.map(({ u }) => u)) / error - 1)).toBeLessThan(0.15);
    expect(Math.abs(rms(nights.map(({ windows }) => windows)) / error / windowsSay - 1)).toBeLessThan(0.12);
  });
});

test('for the weights of generalised least squares it is their own u', () => {
  for (const walk of [0, 3, 50]) {
    const night = series(31, walk, normalDeviates(7 + walk));
    const { weights, u } = walkDifference(night);
    expect(relativeDifference(walkScatter(night, weights)?.u ?? NaN, u ?? NaN)).toBeLessThan(1e-9);
  }
});

test.each([0, 3, 50])('a steady drift of any size changes nothing: the windows take it out (walk %d)', (walk) => {
  const night = series(48, walk, normalDeviates(40 + walk));
  const drifting = night.map((dwell) => ({ ...dwell, value: dwell.value + 0.02 * dwell.timeS }));
  const { weights, value } = abaDifference(night);
  expect(relativeDifference(abaDifference(drifting).value, value)).toBeLessThan(1e-9);
  expect(relativeDifference(walkScatter(drifting, weights)?.u ?? NaN, walkScatter(night, weights)?.u ?? NaN)).toBeLessThan(1e-6);
});

test('few dwells do not tell a walk from noise, and dwells without any scatter tell nothing', () => {
  const weightsOf = (night: readonly SidedValue[]) => abaDifference(night).weights;
  const few = series(enoughForWalk - 1, 1, normalDeviates(3));
  expect(walkScatter(few, weightsOf(few))).toBeNull();
  const still = series(30, 0, normalDeviates(3)).map((one) => ({ ...one, value: one.side }));
  expect(walkScatter(still, weightsOf(still))).toBeNull();
});
