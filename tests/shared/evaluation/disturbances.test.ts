import { readFileSync } from 'node:fs';
import { median, robustMean } from '@/shared/statistics/robust';
import { weightedMean } from '@/shared/statistics/weighted-mean';
import { checkDataPath, relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** Disturbed nights and robust means. Figures: physics.md C7. */

const near = (wideSourceAngleRad * 180) / Math.PI;
const unmeasured = withRig(wideRig(), (r) => delete r.measured);
const wide: NightPlan = { rig: unmeasured, anglesDeg: alternatingAngles(12, near, -near), dwellS: 830 };
const cycleS = 840;
const evaluated = (added: (tS: number) => number, sigma: number) => {
  const normal = normalDeviates(41);
  return evaluateNight({ ...wide, reading: (angle, tS) => angle + added(tS) + sigma * normal() }).result;
};
const quiet = evaluated(() => 0, 5e-6);

test('one-sided bursts of 200 µrad for a minute in a quarter of the dwells cost next to nothing', () => {
  const burst = (tS: number) => (Math.floor(tS / cycleS) % 4 === 1 && tS % cycleS > 300 && tS % cycleS < 360 ? 2e-4 : 0);
  const result = evaluated(burst, 5e-6);
  // Least squares alone is off by 5.6 µrad in such a dwell, 5e-4 of the difference in each burst; u of the quiet night is 7e-5.
  expect(relativeDifference(result.reversal_rad?.value ?? NaN, quiet.reversal_rad?.value ?? NaN)).toBeLessThan(1e-4);
  expect(result.relativeU).toBeLessThan(2 * (quiet.relativeU ?? NaN));
});

test('a pendulum that is knocked in the middle of a dwell swings otherwise from there on, about the same centre', () => {
  const [omega, gamma] = [(2 * Math.PI) / 420, 1 / 1067.43];
  const knock = (tS: number) => {
    const since = (tS % cycleS) - 400;
    return Math.floor(tS / cycleS) === 3 && since > 0 ? 8e-5 * Math.exp(-gamma * since) * Math.sin(omega * since) : 0;
  };
  const result = evaluated(knock, 5e-6);
  expect(relativeDifference(result.reversal_rad?.value ?? NaN, quiet.reversal_rad?.value ?? NaN)).toBeLessThan(3e-5);
  expect(Math.abs((result.period_s?.value ?? NaN) - 420)).toBeLessThan(0.02);
});

test('the means of the 29 densities of 1798', () => {
  const path = checkDataPath('cavendish1798.csv');
  if (path === null) return;
  const values = readFileSync(path, 'utf8')
    .trim()
    .split(/\r?\n/)
    .slice(1)
    .map((line) => Number(line.split(',')[1]));
  expect(median(values)).toBe(5.46);
  const spread = Math.sqrt(values.reduce((sum, value) => sum + (value - 5.447931034483) ** 2, 0) / 28);
  expect(relativeDifference(spread, 0.2209456835376)).toBeLessThan(1e-11);
  const plain = weightedMean(values.map((value) => ({ value, u: spread })));
  expect(relativeDifference(plain.mean, 5.447931034483)).toBeLessThan(1e-12);
  expect(relativeDifference(plain.u, 0.04102858342327)).toBeLessThan(1e-11);
  expect(plain.birgeRatio).toBeCloseTo(1, 11);
  const found = robustMean(values);
  expect(relativeDifference(found.huber, 5.45753933344)).toBeLessThan(1e-9);
  expect(relativeDifference(found.biweight, 5.45566011276)).toBeLessThan(1e-9);
});
