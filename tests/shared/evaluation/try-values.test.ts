import { gBasisSchema, type GBasis } from '@/shared/evaluation/g-basis';
import { documentedValue, tryValues, type TriedValue } from '@/shared/evaluation/try-values';
import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** What is tried in a browser must be what the evaluation itself would say of such a rig. */

const near = (wideSourceAngleRad * 180) / Math.PI;
const rig = withRig(wideRig(), (r) => {
  r.pendulum.arm.u = 2e-6;
  r.sources.orbit = { value: r.sources.orbit?.value ?? 0, u: 5e-6, unit: 'm' };
});
/** The same night, with the same noise, whenever it is asked for. */
const plan = (): NightPlan => {
  const normal = normalDeviates(7);
  return { rig, anglesDeg: alternatingAngles(7, near, -near), dwellS: 830, reading: (angle) => angle + 1e-6 * normal() };
};
const { result, basis: fresh } = evaluateNight(plan());
if (fresh === null) throw new Error('this night has a G');
// As it comes out of the database.
const basis: GBasis = gBasisSchema.parse(JSON.parse(JSON.stringify(fresh)));

const tried = (...values: TriedValue[]) => {
  const found = tryValues(rig, basis, values);
  if ('why' in found) throw new Error(found.why);
  return { bigG: found.bigG, u: found.budget?.u ?? NaN, lines: found.budget?.lines ?? [] };
};
const documented = (input: string): TriedValue => ({ input, ...(documentedValue(rig, basis, input) ?? { value: NaN, u: NaN }) });

test('without a change it is the result, to the last digits', () => {
  const { bigG, u, lines } = tried();
  expect(relativeDifference(bigG, result.G?.value ?? NaN)).toBeLessThan(1e-13);
  expect(relativeDifference(u, result.G?.u ?? NaN)).toBeLessThan(1e-9);
  expect(lines.map(({ input }) => input)).toEqual(result.budget?.map(({ input }) => input));
});

test.each<[string, number, (r: RigDocument) => void]>([
  ['sources.orbit', 1.002, (r) => void (r.sources.orbit = { value: (r.sources.orbit?.value ?? 0) * 1.002, u: 5e-6, unit: 'm' })],
  ['pendulum.arm', 0.999, (r) => void (r.pendulum.arm.value *= 0.999)],
])('with another %s it is what the evaluation makes of the same samples on such a rig', (input, factor, change) => {
  const one = documented(input);
  const { bigG, u } = tried({ ...one, value: one.value * factor });
  const other = evaluateNight(plan(), {}, (records) => ({ ...records, rig: withRig(records.rig, change) })).result.G;
  expect(relativeDifference(bigG, result.G?.value ?? NaN)).toBeGreaterThan(1e-3);
  expect(relativeDifference(bigG, other?.value ?? NaN)).toBeLessThan(1e-8);
  expect(relativeDifference(u, other?.u ?? NaN)).toBeLessThan(1e-3);
});

test('G goes with the inverse of the mass of the sources, and with the square of the period', () => {
  const mass = documented('sources.mass');
  expect(tried({ ...mass, value: 2 * mass.value }).bigG / tried().bigG).toBeCloseTo(0.5, 3);
  const period = documented('period_s');
  expect(tried({ ...period, value: 1.01 * period.value }).bigG / tried().bigG).toBeCloseTo(1 / 1.01 ** 2, 3);
});

test('half the u of an input is half its contribution, and G stays', () => {
  const arm = documented('sources.orbit');
  const before = tried();
  const after = tried({ ...arm, u: arm.u / 2 });
  const contribution = (lines: typeof before.lines) => lines.find(({ input }) => input === 'sources.orbit')?.contribution ?? NaN;
  expect(contribution(after.lines) / contribution(before.lines)).toBeCloseTo(0.5, 6);
  expect(relativeDifference(after.bigG, before.bigG)).toBeLessThan(1e-12);
  expect(after.u).toBeLessThan(before.u);
});

test('what cannot be is said in words', () => {
  const mass = documented('sources.mass');
  expect(tryValues(rig, basis, [{ ...mass, value: -1 }])).toEqual({ why: 'sources.mass has to be greater than 0' });
  expect(tryValues(rig, basis, [{ ...documented('period_s'), value: 0 }])).toEqual({ why: 'period_s has to be greater than 0' });
  expect(documentedValue(rig, basis, 'no.such')).toBeNull();
});
