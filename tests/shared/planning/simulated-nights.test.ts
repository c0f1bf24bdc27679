import { geometricMean, heldAgainstPlan } from '@/scripts/soak/planner/dwell-nights';

/** The planner against simulated nights. A hundred nights each, within 22 % and 7 %, are for the soak `planner`. */
test('nights scatter as planned on three rigs with plain, shaped and awaited swings', () => {
  const planned = heldAgainstPlan(16);
  expect(planned).toHaveLength(9);
  // 16 nights tell a scatter to 18 %, nine times 16 to 6 %: here within three standard deviations.
  for (const ratios of [planned.map(({ ratio }) => ratio), planned.map(({ ratioOfG }) => ratioOfG)]) {
    for (const ratio of ratios) expect(Math.abs(Math.log(ratio))).toBeLessThan(0.54);
    expect(Math.abs(Math.log(geometricMean(ratios)))).toBeLessThan(0.18);
  }
});
