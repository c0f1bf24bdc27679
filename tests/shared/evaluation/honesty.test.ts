import { honestNight, nightKinds } from '@/scripts/soak/honesty/honest-night';

/**
 * Of nights whose geometry, drift, gaps, outliers and clock nobody knows, the true G lies in the 95 % interval as often as it says.
 * 200 of each kind are for `npm run soak -- r11`; of 30 at least 25 (the chance of fewer is 1 in 300).
 */
test('of 30 nights at least 25 hold the true G in their interval, without a bias', () => {
  const nightsOf = (kind: keyof typeof nightKinds, count: number) =>
    Array.from({ length: count }, (_, k) => honestNight(k + 1, nightKinds[kind]));
  const wellMeasured = nightsOf('wellMeasured', 12);
  const nights = [...nightsOf('few', 10), ...nightsOf('many', 8), ...wellMeasured];
  expect(nights.filter(({ inside }) => inside).length).toBeGreaterThanOrEqual(25);
  // Three standard deviations of the mean of 30.
  expect(Math.abs(nights.reduce((sum, { pull }) => sum + pull, 0) / 30)).toBeLessThan(3 / Math.sqrt(30));
  expect(nights.filter(({ result }) => result.alignment?.clockOffset_s != null)).toHaveLength(30);
  // On a rig measured so well it is near minus far before all else that these nights judge, with enough dwells to tell its zero's walk from noise.
  const share = ({ result }: (typeof nights)[number]) => result.budget?.find(({ input }) => input === 'reversal_rad')?.share ?? 0;
  expect(wellMeasured.reduce((sum, night) => sum + share(night), 0) / 12).toBeGreaterThan(0.4);
}, 240_000);
