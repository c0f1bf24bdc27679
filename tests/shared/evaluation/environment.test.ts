import type { ChannelSeries } from '@/shared/archive/run-records';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, nightStartUtcMs, type NightPlan } from '../../support/night';
import { wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** A night whose zero follows the temperature by 20 µrad/K, which wanders from dwell to dwell; noise-free otherwise. */

const trueG = 6.6743e-11;
const near = (wideSourceAngleRad * 180) / Math.PI;
const other = normalDeviates(4711);
const [dwellS, swingS] = [840, 10];
const normal = normalDeviates(8);
const kelvin = Array.from({ length: 14 }, () => 0.4 * normal());
/** It changes in the middle of each swing, where no sample counts. */
const temperatureAt = (tS: number) => 293 + (kelvin[Math.max(0, Math.floor((tS - 10 - swingS / 2) / (dwellS + swingS)))] ?? 0);
const plan: NightPlan = {
  rig: withRig(wideRig(), (rig) => delete rig.measured),
  anglesDeg: alternatingAngles(12, near, -near),
  dwellS,
  reading: (angle, tS) => angle + 20e-6 * (temperatureAt(tS) - 293),
};
const minutes = Array.from({ length: 12 * 15 }, (_, k) => 60 * k);
const channel = (name: string, valueAt: (tS: number) => number): ChannelSeries => ({
  info: { name, quantity: name, unit: 'K', role: 'environment' },
  utcMs: Float64Array.from(minutes, (tS) => nightStartUtcMs + 1000 * tS),
  value: Float64Array.from(minutes, valueAt),
});
const withChannels = (...more: ChannelSeries[]) =>
  evaluateNight(plan, {}, (input) => ({ ...input, channels: [...input.channels, ...more] })).result;

test('what goes with the temperature is offered, with its coefficient and G with and without it, and G stays as it was', () => {
  const plain = evaluateNight(plan).result;
  const result = withChannels(
    channel('box', temperatureAt),
    channel('still', () => 293),
    channel('hall', () => 300 + 0.4 * other()),
  );
  expect(plain.regressions).toBeUndefined();
  expect(result.G).toEqual(plain.G);
  expect(result.reversal_rad).toEqual(plain.reversal_rad);
  expect(relativeDifference(plain.G?.value ?? NaN, trueG)).toBeGreaterThan(2e-4);
  const [box, hall, none] = result.regressions ?? [];
  expect(none).toBeUndefined();
  expect(box).toMatchObject({ channel: 'box', unit: 'K', dwells: 12, coefficient: { unit: 'rad/K' } });
  expect(relativeDifference(box?.coefficient.value ?? NaN, 20e-6)).toBeLessThan(1e-4);
  expect(relativeDifference(box?.without.G?.value ?? NaN, plain.G?.value ?? NaN)).toBeLessThan(1e-9);
  expect(relativeDifference(box?.with.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  expect(box?.with.G?.u ?? NaN).toBeLessThan(plain.G?.u ?? NaN);
  expect(hall?.channel).toBe('hall');
  expect(Math.abs(hall?.coefficient.value ?? NaN)).toBeLessThan(3 * (hall?.coefficient.u ?? NaN));
  const told = result.warnings.filter(({ code }) => code === 'environment');
  expect(told).toHaveLength(1);
  expect(told[0]?.message).toMatch(
    /^The dwells go with the channel "box": .*\srad\/K\. Nothing was taken off; without that part G would be 6\.67/,
  );
});
