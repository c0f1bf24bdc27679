import { forecastNight, pairsToReach } from '@/shared/planning/night-forecast';
import type { Cadence } from '@/shared/planning/night-noise';
import { predictU } from '@/shared/planning/plan-uncertainty';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** What the editor tells of a planned night. */

const cadence: Cadence = {
  dwells: 12,
  dwellS: 830,
  cycleS: 840,
  calibrations: [{ amplitudeRad: 2e-3, lengthS: 1260 }],
  rings: true,
};
const withWalk = (walk: number): RigDocument => ({ ...demoRigWide, noise: { readout_rad: 2e-5, walk_rad_per_sqrt_min: walk } });
const after = (rig: RigDocument, pairs: number) =>
  predictU(rig, { ...cadence, dwells: 2 * pairs }) as NonNullable<ReturnType<typeof predictU>>;

test.each([2e-6, 2e-5, 4e-5])(
  'pairs are enough where u(G) is within 5 %% of what any number of them could come to, and not one pair earlier (walk %d)',
  (walk) => {
    const rig = withWalk(walk);
    const { enoughPairs } = forecastNight(rig, cadence, 11_500) ?? {};
    // After very many, without the dwells' noise and what it does to near minus far and to the period together.
    const { relativeU, statistics, bySource } = after(rig, 1024);
    const least = Math.sqrt(relativeU ** 2 - statistics ** 2 - (bySource['correlation'] ?? 0) ** 2);
    expect(after(rig, enoughPairs ?? NaN).relativeU / least).toBeLessThanOrEqual(1.05);
    if (enoughPairs === 1) return expect(walk).toBe(2e-6);
    return expect(after(rig, (enoughPairs ?? NaN) - 1).relativeU / least).toBeGreaterThan(1.05);
  },
);

test('where the zero walks so far that even a thousand pairs come not near the least u(G), none are said to be enough', () => {
  expect(forecastNight(withWalk(1e-2), cadence, 11_500)?.enoughPairs).toBeNull();
});

test('a wanted u takes the fewest pairs that reach it, and none do where the geometry leaves more open', () => {
  const rig = withWalk(2e-5);
  const wanted = 1.001 * after(rig, 9).relativeU;
  expect(pairsToReach(rig, cadence, wanted)).toBe(9);
  expect(pairsToReach(rig, cadence, 1e-3)).toBeNull();
});

test('the wandering of the zero is what the dwells leave open beyond those of a still zero', () => {
  const rig = withWalk(3e-6);
  const { wandering, predicted } = forecastNight(rig, cadence, 11_500) ?? { wandering: NaN, predicted: { statistics: NaN } };
  expect(Math.hypot(wandering, after(withWalk(0), 6).statistics)).toBeCloseTo(predicted.statistics, 12);
  expect(wandering).toBeGreaterThan(0);
  expect(forecastNight(withWalk(0), cadence, 11_500)?.wandering).toBe(0);
});

test('each other way to spend the hours has its beat and its pairs', () => {
  const found = forecastNight(withWalk(3e-6), cadence, 43_200)?.strategies ?? [];
  expect(found.map(({ strategy }) => strategy)).toEqual(['plain', 'shaped', 'wait']);
  // A beat of one period with a ring-down to tell period and decay from (J2): 102 dwells in twelve hours.
  expect(found[0]?.cadence).toMatchObject({ dwells: 102, cycleS: 420 });
  for (const { cadence: one } of found) expect(one.dwells * one.cycleS).toBeLessThanOrEqual(43_200);
});

test('a rig without a measured pendulum has no forecast', () => {
  expect(forecastNight({ ...demoRigWide, measured: undefined }, cadence, 11_500)).toBeNull();
});
