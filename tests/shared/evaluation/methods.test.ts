import { walkFit } from '@/shared/statistics/gls-drift';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** Methods beside the equilibria, and still nights. Noise-free nights give back the G they were made with. */

const trueG = 6.6743e-11;
const degrees = (rad: number) => (rad * 180) / Math.PI;
const near = degrees(wideSourceAngleRad);
const closeNear = degrees(closeSourceAngleRad);
const unmeasured = (rig = wideRig()) => withRig(rig, (r) => delete r.measured);
const swings: NightPlan = { rig: unmeasured(), anglesDeg: [90, 0, 90, 0, 90, 0], dwellS: 1680 };

describe('the time of swing', () => {
  test.each<[string, NightPlan]>([
    ['in line and across on the wide rig', swings],
    ['near and across on the close rig', { rig: unmeasured(closeRig()), anglesDeg: [90, closeNear, 90, closeNear, 90], dwellS: 1680 }],
  ])('%s', (_name, plan) => {
    const { result } = evaluateNight(plan, { method: 'period' });
    expect(result.method).toBe('period');
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
    expect(result.period_s?.value).toBeCloseTo(420, 6);
  });

  test('needs neither lever nor scale, and the source mass in proportion', () => {
    const rig = withRig(unmeasured(), (r) => void Object.assign(r.sources.mass as object, { u: 0.0016 }));
    const { result } = evaluateNight({ ...swings, rig, reading: (angle) => 3 * angle + 0.2 }, { method: 'period' });
    // A scale three times too great bends nothing: only the small amplitude correction is three times its size.
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-4);
    const mass = result.budget?.find(({ input }) => input === 'sources.mass');
    expect(relativeDifference(((mass?.sensitivity ?? NaN) * 1.6) / trueG, -1)).toBeLessThan(1e-3);
    expect(result.budget?.map(({ input }) => input)).not.toContain('lever.distance');
  });

  test('says with noise how well it is known', () => {
    const normal = normalDeviates(31);
    const { result } = evaluateNight({ ...swings, reading: (angle) => angle + 2e-6 * normal() }, { method: 'period' });
    const { value, u } = result.G as { value: number; u: number };
    expect(Math.abs(value - trueG)).toBeLessThan(4 * u);
    expect(u / trueG).toBeLessThan(0.05);
  });

  test('is refused where the sources stiffen the pendulum alike', () => {
    const plan = { rig: unmeasured(), anglesDeg: alternatingAngles(4, near, -near), dwellS: 900 };
    expect(() => evaluateNight(plan, { method: 'period' })).toThrow(
      'steps.csv: the method "period" needs dwells or ring-downs at two angles',
    );
  });
});

test.each<[string, NightPlan]>([
  ['wide', { rig: unmeasured(), anglesDeg: alternatingAngles(8, near, -near), dwellS: 830 }],
  ['close', { rig: unmeasured(closeRig()), anglesDeg: alternatingAngles(8, closeNear, 180 - closeNear), dwellS: 818 }],
])('the acceleration after each swing, %s rig', (_name, plan) => {
  const { result } = evaluateNight(plan, { method: 'acceleration' });
  expect(result.method).toBe('acceleration');
  expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
});

describe('the methods beside each other', () => {
  const normal = normalDeviates(17);
  const reading = (angle: number) => angle + 1e-6 * normal();

  test('agree on a night of near, far and across, with a u that leaves out what they share', () => {
    const rig = withRig(unmeasured(), (r) => void Object.assign(r.sources.mass as object, { u: 0.016 }));
    const anglesDeg = [near, -near, 90, near, -near, 90, near, -near, 90];
    const { result } = evaluateNight({ rig, anglesDeg, dwellS: 1260, reading }, { besides: true });
    const methods = result.methods ?? [];
    expect(methods.map(({ method }) => method)).toEqual(['equilibrium', 'period', 'acceleration']);
    expect(methods[0]).toMatchObject({ G: result.G, relativeU: result.relativeU, difference: null, why: null });
    for (const { G, difference, why } of methods.slice(1)) {
      expect(why).toBeNull();
      expect(difference?.value).toBeCloseTo((G?.value ?? NaN) - (result.G?.value ?? NaN), 25);
      expect(Math.abs(difference?.value ?? NaN)).toBeLessThan(4 * (difference?.u ?? NaN));
    }
    // One per cent of the mass moves both alike: it is in each u, and not in that of their difference.
    const acceleration = methods[2];
    expect(acceleration?.relativeU).toBeGreaterThan(0.0099);
    expect((acceleration?.difference?.u ?? NaN) / trueG).toBeLessThan(0.005);
  });

  test('of which one gives nothing say why', () => {
    const plan = { rig: unmeasured(), anglesDeg: alternatingAngles(4, near, -near), dwellS: 900, reading };
    const period = evaluateNight(plan, { besides: true }).result.methods?.[1];
    expect(period).toMatchObject({ method: 'period', G: null, why: expect.stringContaining('two angles') });
    expect(evaluateNight(plan, {}).result.methods).toBeUndefined();
  });
});

describe('the ways to take the drift off beside each other', () => {
  const normal = normalDeviates(23);
  const noisy = (angle: number) => angle + 1e-6 * normal();

  test('are three for dwells by turns, the result among them, and agree where there is noise alone', () => {
    const plan = { rig: unmeasured(), anglesDeg: alternatingAngles(9, near, -near), dwellS: 900, reading: noisy };
    const { reversal_rad: reversal, drifts = [] } = evaluateNight(plan, { besides: true }).result;
    expect(drifts.map(({ drift }) => drift)).toEqual(['aba', 'polynomial', 'gls']);
    expect(drifts[0]?.reversal_rad).toEqual({ value: reversal?.value, u: reversal?.u });
    for (const { reversal_rad: one } of drifts.slice(1)) {
      expect(Math.abs(one.value - (reversal?.value ?? NaN))).toBeLessThan(4 * (one.u ?? NaN));
      expect(one.value).not.toBe(reversal?.value);
    }
    expect(evaluateNight(plan, {}).result.drifts).toBeUndefined();
  });

  test('are without windows where the dwells do not alternate', () => {
    const anglesDeg = [near, -near, -near, near, -near, -near, near, -near];
    const { drifts = [] } = evaluateNight({ rig: unmeasured(), anglesDeg, dwellS: 900, reading: noisy }, { besides: true }).result;
    expect(drifts.map(({ drift }) => drift)).toEqual(['polynomial', 'gls']);
  });
});

test('generalised least squares against a wandering zero: the cost of 48 dwells (physics.md D4)', () => {
  const series = Array.from({ length: 48 }, (_, k) => ({ timeS: 1000 * k, side: k % 2 === 0 ? (1 as const) : (-1 as const), value: 0 }));
  const cost = (ratio: number) => (48 * walkFit(series, ratio).unitVariance) / 4;
  expect(cost(0)).toBeCloseTo(1, 9);
  // 1.0133, 1.111, 2.05 there with the walk averaged over each dwell; here it is taken at mid-dwell.
  expect(cost(0.1)).toBeCloseTo(1.0133, 1);
  expect(cost(1)).toBeGreaterThan(1.1);
  expect(cost(10)).toBeGreaterThan(2.05);
  const { weights } = walkFit(series, 1).estimate;
  expect(weights.reduce((sum, w) => sum + w, 0)).toBeCloseTo(0, 12);
  expect(weights.reduce((sum, w, k) => sum + w * (series[k]?.side ?? 0), 0)).toBeCloseTo(2, 12);
  // Beside a steady drift neither the zero nor the drift reaches the difference; sides by turns and time go together by 3/(n² − 1).
  const steady = walkFit(series, 1, true).estimate.weights;
  expect(steady.reduce((sum, w, k) => sum + w * (series[k]?.timeS ?? 0), 0) / 48_000).toBeCloseTo(0, 12);
  expect(steady.reduce((sum, w, k) => sum + w * (series[k]?.side ?? 0), 0)).toBeCloseTo(2, 12);
  expect((48 * walkFit(series, 0, true).unitVariance) / 4).toBeCloseTo(1 / (1 - 3 / (48 ** 2 - 1)), 12);
});

describe('a still night', () => {
  const still = (reading: NightPlan['reading']): NightPlan => ({ anglesDeg: Array.from({ length: 17 }, () => near), dwellS: 840, reading });
  const withoutSwings = (plan: NightPlan) =>
    evaluateNight(plan, {}, (records) => ({ ...records, steps: records.steps.filter(({ kind }) => kind !== 'swing') })).result;

  test('gives the false difference that the planned cadence would have given', () => {
    const normal = normalDeviates(13);
    const result = withoutSwings(still((_, tS) => 1e-4 + 2e-9 * tS + 1e-5 * normal()));
    expect(result).toMatchObject({ G: null, reversal_rad: null });
    const { value, u, count } = result.pretend as { value: number; u: number; count: number };
    expect(count).toBe(15);
    // σ 10 µrad at 1 Hz, 16 dwells of 834 s: 2 · 10 µrad / √(16 · 834), and nothing of the drift.
    expect(u / 1.73e-7).toBeGreaterThan(0.5);
    expect(u / 1.73e-7).toBeLessThan(2);
    expect(Math.abs(value)).toBeLessThan(4 * u);
    expect(result.pretend?.allan[0]?.tau_s).toBeCloseTo(840, 6);
  });

  test('of two dwells pretends nothing', () => {
    expect(withoutSwings({ ...still(() => 1e-4), anglesDeg: [near, near, near] }).pretend).toBeNull();
  });
});
