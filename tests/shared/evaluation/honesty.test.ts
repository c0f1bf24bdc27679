import { honestNight } from '@/scripts/soak/honesty/honest-night';

/**
 * Of nights whose geometry, drift, gaps, outliers and clock nobody knows, the true G lies in the 95 % interval as often as it says.
 * 200 of them are for the soak `honesty`; of 30 at least 25 (the chance of fewer is 1 in 300).
 */
test('of 30 nights at least 25 hold the true G in their interval, without a bias', () => {
  const nights = Array.from({ length: 30 }, (_, k) => honestNight(k + 1));
  expect(nights.filter(({ inside }) => inside).length).toBeGreaterThanOrEqual(25);
  // Three standard deviations of the mean of 30.
  expect(Math.abs(nights.reduce((sum, { pull }) => sum + pull, 0) / 30)).toBeLessThan(3 / Math.sqrt(30));
  expect(nights.filter(({ result }) => result.alignment?.clockOffset_s != null)).toHaveLength(30);
}, 240_000);
