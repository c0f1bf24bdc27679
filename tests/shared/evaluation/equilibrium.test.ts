import { readFileSync } from 'node:fs';
import { evaluationResultSchema } from '@/shared/evaluation/result';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

const trueG = 6.6743e-11;
const near = (wideSourceAngleRad * 180) / Math.PI;
const closeNear = (closeSourceAngleRad * 180) / Math.PI;
const withoutMeasured = (rig = wideRig()) => withRig(rig, (r) => delete r.measured);
const wideNight: NightPlan = { anglesDeg: alternatingAngles(8, near, -near), dwellS: 840 };

const gOf = (plan: NightPlan) => evaluateNight(plan).result.G?.value ?? NaN;

describe('G comes back from noise-free nights of an exactly known rig', () => {
  test.each([840, 900, 1000, 1260])('wide rig, dwells of %d s, κ from the ring-down alone', (dwellS) => {
    expect(relativeDifference(gOf({ ...wideNight, rig: withoutMeasured(), dwellS }), trueG)).toBeLessThan(1e-7);
  });

  test('wide rig with the measured period and decay time', () => {
    expect(relativeDifference(gOf(wideNight), trueG)).toBeLessThan(1e-7);
  });

  test('wide rig with short dwells of one and a half periods', () => {
    expect(relativeDifference(gOf({ ...wideNight, rig: withoutMeasured(), dwellS: 610 }), trueG)).toBeLessThan(1e-6);
  });

  test('close rig, whose stiffness and torque are far from linear', () => {
    const plan = { rig: withoutMeasured(closeRig()), anglesDeg: alternatingAngles(8, closeNear, 180 - closeNear), dwellS: 900 };
    const { result } = evaluateNight(plan);
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    expect(result.period_s?.value).toBeCloseTo(420, 4);
    expect(result.decayTime_s?.value).toBeCloseTo(1067.4302650055924, 2);
    expect(relativeDifference(result.kappa_N_m?.value ?? NaN, 5.211972603453e-8)).toBeLessThan(1e-7);
  });

  test('a wide rig off the angle of greatest torque, where the stiffness is not small', () => {
    const rig = withRig(withoutMeasured(), (r) => {
      r.stations = { near: { value: 40, u: 0, unit: 'deg' }, far: { value: -40, u: 0, unit: 'deg' } };
    });
    expect(relativeDifference(gOf({ rig, anglesDeg: alternatingAngles(8, 40, -40), dwellS: 900 }), trueG)).toBeLessThan(1e-6);
  });

  test('another G, a lighter source above the balls, a higher Q', () => {
    const rig = withRig(withoutMeasured(), (r) => {
      r.sources.offset = { value: 0.004, u: 0, unit: 'm' };
      r.sources.mass = { value: 0.7, u: 0, unit: 'kg' };
    });
    const plan = { ...wideNight, rig, bigG: 7.1e-11, decayTimeS: 4000, periodS: 300, dwellS: 750 };
    expect(relativeDifference(gOf(plan), 7.1e-11)).toBeLessThan(1e-6);
  });
});

describe('whatever the channel', () => {
  const theta = { near: 0.001186912843431, far: -0.001186912843431 };

  test.each([
    ['rad', 1, 0.0213],
    ['mrad', 1e3, -3.7],
    ['urad', 1e6, 120.5],
  ])('%s with any zero', (unit, perRad, zero) => {
    const { result } = evaluateNight({ ...wideNight, unit, reading: (angle) => zero + perRad * angle });
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
    expect(relativeDifference(result.reversal_rad?.value ?? NaN, theta.near - theta.far)).toBeLessThan(1e-6);
  });

  test.each([
    ['m', 1, 0.412, 1],
    ['mm', 1e3, -77.3, 1],
    ['m', 1, -0.0031, -1],
    ['mm', 1e3, 901, -1],
  ] as const)('a spot position in %s (scale %d, zero %d, sense %d)', (...[unit, perMetre, zero, sense]) => {
    const rig = withRig(wideRig(), (r) => (r.lever = { distance: { value: 5, u: 0, unit: 'm' }, fold: 2, sense }));
    const { result } = evaluateNight({ ...wideNight, rig, unit, reading: (angle) => zero + perMetre * sense * 5 * Math.tan(2 * angle) });
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
    expect(result.warnings.map(({ code }) => code)).not.toContain('sign');
  });

  test('a beam far from normal to the scale needs its zero, and with it comes out right', () => {
    // The beam is normal to the scale where the arm is turned by −0.03 rad: 0.6 % of the reversal in a small-angle reading.
    const reading = (angle: number) => 0.2 + 5 * Math.tan(2 * (angle + 0.03));
    const lever = { distance: { value: 5, u: 0, unit: 'm' as const }, fold: 2, sense: 1 as const };
    const given = withRig(wideRig(), (r) => (r.lever = { ...lever, zero: { value: 0.2, u: 0, unit: 'm' } }));
    expect(relativeDifference(gOf({ ...wideNight, rig: given, unit: 'm', reading }), trueG)).toBeLessThan(1e-6);
    const guessed = withRig(wideRig(), (r) => (r.lever = lever));
    expect(gOf({ ...wideNight, rig: guessed, unit: 'm', reading }) / trueG - 1).toBeCloseTo(0.0036, 3);
  });
});

describe('whatever the stations', () => {
  test('half a turn further counts as the same station', () => {
    const anglesDeg = [-near, near, 180 - near, near - 180, -near, near, -near, near - 180, 180 - near];
    const { result } = evaluateNight({ ...wideNight, anglesDeg });
    expect(result.dwells.map(({ station }) => station)).toEqual(['near', 'far', 'near', 'far', 'near', 'far', 'near', 'far']);
    expect(result.reversal_rad?.count).toBe(7);
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });

  test('the achieved angles count, not the nominal ones', () => {
    const rig = withRig(wideRig(), (r) => {
      r.stations = { near: { value: 30.5, u: 0.05, unit: 'deg' }, far: { value: -30.5, u: 0.05, unit: 'deg' } };
    });
    const anglesDeg = [-30, 30, -30.4, 30.9, -29.8, 30.2, -30.7, 30.1, -30];
    expect(relativeDifference(gOf({ ...wideNight, rig, anglesDeg }), trueG)).toBeLessThan(1e-6);
  });

  test('dwells elsewhere help with the period and stay out of the difference', () => {
    const anglesDeg = [-near, near, -near, 90, near, -near, 0, near, -near];
    const { result } = evaluateNight({ ...wideNight, rig: withoutMeasured(), anglesDeg });
    const elsewhere = result.dwells.filter(({ used }) => !used);
    expect(elsewhere.map(({ why }) => why)).toEqual(['neither near nor far', 'neither near nor far']);
    expect(elsewhere.every(({ theta_rad: found }) => found !== null)).toBe(true);
    expect(result.reversal_rad?.count).toBe(5);
    expect(result.period_s?.value).toBeCloseTo(420, 4);
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });
});

describe('drift and noise', () => {
  test('a straight drift leaves no trace, however strong', () => {
    expect(relativeDifference(gOf({ ...wideNight, reading: (angle, t) => angle + 3e-7 * t }), trueG)).toBeLessThan(1e-6);
  });

  test('a night of white noise gives G within its uncertainty, and an uncertainty of the size that the noise makes', () => {
    const normal = normalDeviates(11);
    let sumOfSquares = 0;
    const nights = 12;
    for (let k = 0; k < nights; k += 1) {
      const { result } = evaluateNight({
        ...wideNight,
        anglesDeg: alternatingAngles(16, near, -near),
        reading: (angle) => angle + 2e-5 * normal(),
      });
      const { value, u } = result.G as { value: number; u: number };
      sumOfSquares += ((value - trueG) / u) ** 2 / nights;
      // σ = 20 µrad at 1 Hz, 834 samples a dwell, 16 dwells: 2 · 20 µrad / √(834 · 16), somewhat more for the free columns.
      expect((result.reversal_rad?.u ?? 0) / 3.46e-7).toBeGreaterThan(0.5);
      expect((result.reversal_rad?.u ?? 0) / 3.46e-7).toBeLessThan(2);
    }
    expect(sumOfSquares).toBeGreaterThan(0.3);
    expect(sumOfSquares).toBeLessThan(2.5);
  });

  test('the period and the decay time carry an uncertainty that covers what they are', () => {
    const normal = normalDeviates(3);
    const { result } = evaluateNight({ ...wideNight, rig: withoutMeasured(), reading: (angle) => angle + 1e-5 * normal() });
    const { period_s: period, decayTime_s: decay } = result;
    expect(Math.abs((period?.value ?? 0) - 420)).toBeLessThan(4 * (period?.u ?? 0));
    expect(Math.abs((decay?.value ?? 0) - 1067.43)).toBeLessThan(4 * (decay?.u ?? 0));
    expect(period?.u).toBeLessThan(0.1);
  });
});

test('the result is of the published form, and the curves follow the data', () => {
  const { result, curves } = evaluateNight(wideNight);
  expect(evaluationResultSchema.parse(result)).toEqual(result);
  expect(result).toMatchObject({ formatVersion: 1, method: 'equilibrium', monteCarlo: null, registered: null });
  expect(curves).toHaveLength(8);
  for (const { tS, dataRad, modelRad } of curves) {
    expect(dataRad).toHaveLength(tS.length);
    modelRad.forEach((value, k) => expect(Math.abs(value - (dataRad[k] as number))).toBeLessThan(1e-7));
  }
});

test('the evaluation is pure: it neither reads a clock nor draws a number', () => {
  for (const name of ['evaluate-archive', 'analysis', 'budget', 'solve-g', 'curvature', 'ring-down-fit']) {
    expect(readFileSync(`shared/evaluation/${name}.ts`, 'utf8')).not.toMatch(/Date\.now|Math\.random|new Date\(\)|from 'node:/);
  }
});
