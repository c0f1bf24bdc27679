import type { MorningNight } from '@/shared/contracts/morning';
import { differenceInU, meanBefore, nightsTogether, qualityOf } from '@/shared/morning/earlier-nights';
import { oscillatorOf } from '@/shared/physics/oscillator';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const night = (period_s: number, control = false): MorningNight => ({
  ...{ runId: 'a', startedAt: '2031-03-14T22:00:00Z', control, kappa_N_m: null },
  ...{ reversal_rad: { value: 1e-3, u: null }, period_s: { value: period_s, u: 1 }, decayTime_s: { value: 2000, u: null } },
});

test('two nights are compared by the uncertainty of their difference, and not at all where one has none', () => {
  expect(differenceInU({ value: 1.0, u: 0.03 }, { value: 1.1, u: 0.04 })).toBeCloseTo(2, 12);
  expect(differenceInU({ value: 1, u: null }, { value: 1.1, u: 0.04 })).toBeNull();
  expect(differenceInU({ value: 1, u: 0 }, { value: 1.1, u: 0 })).toBeNull();
});

test('Q of a night is that of the oscillator with its period and decay time', () => {
  const [period, decayTime] = [demoRigWide.measured?.period_s?.value ?? NaN, demoRigWide.measured?.decayTime_s?.value ?? NaN];
  const quality = qualityOf({ period_s: { value: period, u: 0.1 }, decayTime_s: { value: decayTime, u: 1 } });
  expect(quality?.value).toBeCloseTo(oscillatorOf(demoRigWide)?.quality ?? NaN, 9);
});

test('its u is the one that small changes of period and decay time make', () => {
  const at = (T: number, tau: number) => qualityOf({ period_s: { value: T, u: 0.5 }, decayTime_s: { value: tau, u: 4 } });
  // Q = 3 or so: the quarter counts.
  const [T, tau, d] = [600, 570, 1e-3];
  const slope = (one: number, other: number) => (one - other) / (2 * d);
  const [byT, byTau] = [
    slope(at(T + d, tau)?.value ?? NaN, at(T - d, tau)?.value ?? NaN),
    slope(at(T, tau + d)?.value ?? NaN, at(T, tau - d)?.value ?? NaN),
  ];
  expect(at(T, tau)?.u).toBeCloseTo(Math.hypot(byT * 0.5, byTau * 4), 6);
  expect(qualityOf({ period_s: { value: T, u: null }, decayTime_s: { value: tau, u: 4 } })?.u).toBeNull();
  expect(qualityOf({ period_s: null, decayTime_s: { value: tau, u: 4 } })).toBeNull();
});

test('the mean of earlier nights leaves the control out, and those without the quantity', () => {
  const nights = [night(600), night(604), night(900, true), { ...night(0), period_s: null }];
  expect(meanBefore(nights, ({ period_s }) => period_s)).toBe(602);
  expect(meanBefore(nights, ({ kappa_N_m }) => kappa_N_m)).toBeNull();
});

describe('near minus far of several nights', () => {
  const of = (value: number, u: number | null, control = false): MorningNight => ({ ...night(600, control), reversal_rad: { value, u } });

  test('is their mean, with what each night has of its own where they scatter more than their u say', () => {
    // Equal u of 1 and a variance of 16: the scatter of a night is √15, u of the mean 4/√3.
    const found = nightsTogether(of(4, 1), [of(0, 1), of(-4, 1), of(100, 1, true), of(50, null)]);
    expect(found).toMatchObject({ nights: 3 });
    expect(found?.common.mean).toBeCloseTo(0, 12);
    expect(found?.widenedU).toBeCloseTo(4 / Math.sqrt(3), 9);
    expect(found?.own.scatter).toBeCloseTo(Math.sqrt(15), 9);
    expect(found?.own.u).toBeCloseTo(4 / Math.sqrt(3), 9);
  });

  test('of controls is that of controls; two nights tell no scatter', () => {
    expect(nightsTogether(of(1, 1, true), [of(2, 1), of(3, 1), of(4, 1)])).toBeNull();
    expect(nightsTogether(of(1, 1), [of(2, 1)])).toBeNull();
  });
});
