import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import type { StepRow } from '@/shared/archive/run-records';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight, evaluateRecords } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, night, nightStartUtcMs, type NightPlan } from '../../support/night';
import { wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

const trueG = 6.6743e-11;
const near = (wideSourceAngleRad * 180) / Math.PI;
const wide: NightPlan = { anglesDeg: alternatingAngles(8, near, -near), dwellS: 840 };
const codes = (result: EvaluationResult) => result.warnings.map(({ code }) => code);

/** The night with some of its rows changed. */
const withRows = (change: (row: StepRow) => Partial<StepRow>) => evaluateNight({ ...wide, row: change }).result;
const ofSeq = (seq: number, changes: Partial<StepRow>) => (row: StepRow) => (row.seq === seq ? changes : {});

function dwell(result: EvaluationResult, seq: number) {
  return result.dwells.find((one) => one.seq === seq);
}

describe('which dwells count', () => {
  test('one that is not good is left out, and the rest no longer alternates', () => {
    const result = withRows(ofSeq(6, { good: false }));
    expect(dwell(result, 6)).toMatchObject({ used: false, why: 'not good', theta_rad: null });
    expect(codes(result)).toContain('not-alternating');
    expect(result.reversal_rad?.count).toBe(5);
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });

  test('without the column for good all count', () => {
    const result = withRows(() => ({ good: null }));
    expect(result.dwells.every(({ used }) => used)).toBe(true);
  });

  test.each(['failed', 'skipped'] as const)('one that %s is left out', (outcome) => {
    expect(dwell(withRows(ofSeq(2, { outcome })), 2)).toMatchObject({ used: false, why: outcome });
  });

  test('one that is still going on is left out', () => {
    expect(dwell(withRows(ofSeq(16, { endUtcMs: null, outcome: null })), 16)).toMatchObject({ used: false, why: 'not finished' });
  });

  test.each([
    { periods: 1.26, used: true },
    { periods: 1.24, used: false },
  ])('one cut short after $periods periods: used $used', ({ periods, used }) => {
    const result = evaluateNight({
      ...wide,
      row: (row) => (row.seq === 16 ? { outcome: 'cut short', endUtcMs: row.startUtcMs + periods * 420_000 } : {}),
    }).result;
    expect(dwell(result, 16)?.used).toBe(used);
    if (!used) expect(dwell(result, 16)?.why).toContain('cut short');
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });

  test('an exclusion takes samples, and the dwell only when most of it is gone', () => {
    const records = night(wide);
    const start = records.steps[3]?.startUtcMs as number;
    const excluded = (seconds: number): BuildArchiveInput => ({
      ...records,
      exclusions: [{ startUtcMs: start + 100_000, endUtcMs: start + 100_000 + seconds * 1000, reason: 'door' }],
    });
    const all = dwell(evaluateRecords(records).result, 4)?.samples as number;
    const some = evaluateRecords(excluded(120)).result;
    expect(dwell(some, 4)?.used).toBe(true);
    expect(all - (dwell(some, 4)?.samples ?? 0)).toBeGreaterThanOrEqual(57);
    expect(relativeDifference(some.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    const most = evaluateRecords(excluded(600)).result;
    expect(dwell(most, 4)).toMatchObject({ used: false, why: 'samples cover less than half of it' });
  });

  test('a dwell without samples is left out with that reason', () => {
    const records = night(wide);
    const [channel] = records.channels;
    if (channel === undefined) throw new Error('a night has a channel');
    const keep = [...channel.utcMs]
      .map((ms, k) => ({ ms, value: channel.value[k] as number }))
      .filter(({ ms }) => ms < (records.steps.at(-1)?.startUtcMs as number));
    const cut = { ...channel, utcMs: Float64Array.from(keep, ({ ms }) => ms), value: Float64Array.from(keep, ({ value }) => value) };
    expect(dwell(evaluateRecords({ ...records, channels: [cut] }).result, 16)).toMatchObject({
      used: false,
      why: 'no samples',
      samples: 0,
    });
  });

  test('a short disturbance does no harm, excluded or not', () => {
    const bumpAt = 10 + 9.7 + 400;
    const reading = (angle: number, t: number) => angle + (t > bumpAt && t < bumpAt + 60 ? 2e-4 : 0);
    const records = night({ ...wide, reading });
    const cleaned = {
      ...records,
      exclusions: [{ startUtcMs: nightStartUtcMs + (bumpAt - 5) * 1000, endUtcMs: nightStartUtcMs + (bumpAt + 65) * 1000, reason: '' }],
    };
    expect(relativeDifference(evaluateRecords(cleaned).result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    expect(relativeDifference(evaluateRecords(records).result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });

  test('a ring-down row joins the fit of the period and is no dwell', () => {
    const result = evaluateNight({
      ...wide,
      rig: withRig(wideRig(), (r) => delete r.measured),
      row: ofSeq(2, { kind: 'ring-down', good: null }),
    }).result;
    expect(result.dwells.map(({ seq }) => seq)).not.toContain(2);
    expect(result.reversal_rad?.count).toBe(6);
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
  });
});

describe('what cannot be computed is null', () => {
  test('near alone gives no difference and no G, but a period', () => {
    const result = evaluateNight({ ...wide, anglesDeg: [90, near, near - 180, near, near - 180] }).result;
    expect(result).toMatchObject({ reversal_rad: null, G: null, relativeU: null, budget: null, codata: { En: null } });
    expect(result.period_s?.value).toBeCloseTo(420, 3);
    expect(result.dwells.every(({ station, used }) => station === 'near' && used)).toBe(true);
    expect(codes(result)).toContain('few-dwells');
  });

  test('dwells elsewhere alone give a period', () => {
    const result = evaluateNight({ ...wide, rig: withRig(wideRig(), (r) => delete r.measured), anglesDeg: [20, 0, 90, 0, 90] }).result;
    expect(result.reversal_rad).toBeNull();
    expect(result.period_s?.value).toBeCloseTo(420, 3);
  });

  test('an empty control has a difference and no G', () => {
    const rig = withRig(wideRig(), (r) => (r.sources = { shape: 'none' }));
    const result = evaluateNight({ ...wide, rig, reading: (_angle, t) => 3e-5 + 1e-9 * t }).result;
    expect(result).toMatchObject({ G: null, budget: null });
    expect(result.reversal_rad?.value).toBeCloseTo(0, 12);
    expect(result.reversal_rad).toMatchObject({ count: 7, equivalence: { bound_rad: null, p: null, equivalent: null } });
    expect(result.period_s).toEqual({ value: 420, u: 0 });
  });

  test('a still night has neither difference nor G', () => {
    const still = evaluateNight({ ...wide, anglesDeg: [90, 90, 90, 90], reading: () => 1e-4 }, {}, (records) => ({
      ...records,
      steps: records.steps.filter(({ kind }) => kind === 'dwell'),
    }));
    expect(still.result).toMatchObject({ reversal_rad: null, G: null });
  });

  test('a zero that wanders is not taken for ringing', () => {
    const normal = normalDeviates(8);
    let zero = 0;
    const rig = withRig(wideRig(), (r) => {
      r.sources = { shape: 'none' };
      r.measured = { period_s: { value: 420, u: 0.1, unit: 's' } };
    });
    const result = evaluateNight({ ...wide, rig, reading: () => (zero += 2e-7 * normal()) }).result;
    expect(result.period_s).toEqual({ value: 420, u: expect.closeTo(0.1, 12) as number });
    expect(codes(result)).toEqual(['decay-unknown']);
  });

  test('an empty control is held against what the parts that turn along must give, within a thousandth of the loaded signal', () => {
    const normal = normalDeviates(17);
    const rig = withRig(wideRig(), (r) => {
      const metres = (value: number) => ({ value, u: 0, unit: 'm' as const });
      const cradle = { mass: { value: 0.06, u: 0, unit: 'kg' as const }, angle: { value: 0, u: 0, unit: 'deg' as const } };
      r.sources = { ...r.sources, shape: 'none', extra: [{ label: 'cradle', orbit: metres(0.125), offset: metres(-0.04), ...cradle }] };
    });
    const reading = (_: number, tS: number) => (Math.floor(tS / 850) % 2 === 0 ? 2.5e-5 : -2.5e-5) + 2e-6 * normal();
    const of = (options = {}) => evaluateNight({ ...wide, rig, reading }, options).result.reversal_rad?.equivalence;
    // 2.1 % of the signal of 2.3738 mrad (practice.md 1.7).
    expect((of()?.expected_rad ?? 0) / 2.373825686861e-3).toBeCloseTo(0.021, 3);
    expect((of()?.bound_rad ?? 0) / 2.373825686861e-6).toBeCloseTo(1.021, 3);
    expect(of({ boundRad: 2e-5 })).toMatchObject({ bound_rad: 2e-5, equivalent: true });
    expect(of({ boundRad: 1e-8 })?.equivalent).toBe(false);
  });

  test('three dwells give a value without an uncertainty, and say so', () => {
    const result = evaluateNight({ ...wide, anglesDeg: alternatingAngles(3, near, -near) }).result;
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    expect(result).toMatchObject({
      G: { u: null, degreesOfFreedom: null },
      relativeU: null,
      budget: null,
      reversal_rad: { u: null, count: 2 },
    });
    expect(codes(result)).toContain('few-dwells');
  });

  test('two dwells give a plain difference', () => {
    const result = evaluateNight({ ...wide, anglesDeg: alternatingAngles(2, near, -near) }).result;
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    expect(result.reversal_rad).toMatchObject({ u: null, count: 1 });
  });

  test('nothing that tells the period is unusable', () => {
    const rig = withRig(wideRig(), (r) => delete r.measured);
    expect(() => evaluateNight({ ...wide, rig, reading: () => 0 })).toThrow('nothing tells the period');
  });

  test('a pendulum that never rings is taken with the measured period', () => {
    const result = evaluateNight({ ...wide, reading: () => 1e-4 }).result;
    expect(result.period_s?.value).toBe(420);
    expect(result.G?.value).toBeCloseTo(0, 20);
  });
});

describe('drift', () => {
  const quadratic = (angle: number, t: number) => angle + 3e-16 * t * t * t;
  const registered = (drift: 'aba' | 'polynomial', order?: number): BuildArchiveInput['protocol'] => ({
    formatVersion: 1,
    name: 'x',
    steps: [{ kind: 'home' }],
    evaluation: { method: 'equilibrium', drift, ...(order === undefined ? {} : { order }) },
  });
  const miss = (protocol: BuildArchiveInput['protocol']) =>
    relativeDifference(
      evaluateNight({ ...wide, anglesDeg: alternatingAngles(7, near, -near), reading: quadratic, protocol }).result.G?.value ?? NaN,
      trueG,
    );

  test('a cubic one is removed by a polynomial of its order and not by a lower one', () => {
    const [third, first] = [miss(registered('polynomial', 3)), miss(registered('polynomial'))];
    expect(third).toBeLessThan(1e-5);
    expect(first).toBeGreaterThan(1e-4);
  });

  test('the registered model is used, and the result says that it is as registered', () => {
    const of = (protocol: NightPlan['protocol'], options = {}) =>
      evaluateNight({ ...wide, ...(protocol === undefined ? {} : { protocol }) }, options).result.registered;
    expect(of(registered('polynomial', 2))).toBe(true);
    expect(of(undefined)).toBeNull();
    const named = { ...(registered('aba') as object), evaluation: { channel: 'deflection' } } as NightPlan['protocol'];
    expect(of(named)).toBe(true);
  });
});
