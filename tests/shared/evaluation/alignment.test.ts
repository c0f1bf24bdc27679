import type { ClockChoice } from '@/shared/evaluation/clock-choice';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { relativeDifference } from '../../support/check-data';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** The channel's clock against the step log's. Figures: physics.md H2, H3. */

const trueG = 6.6743e-11;
const degrees = (rad: number) => (rad * 180) / Math.PI;
const near = degrees(wideSourceAngleRad);
const closeNear = degrees(closeSourceAngleRad);
const motion = { stepsPerDegree: 44.444, minDeg: -175, maxDeg: 175, homeDeg: 90, maxSpeed_deg_s: 6, maxAcceleration_deg_s2: 2 };
const wide: NightPlan = { rig: withRig(wideRig(), (r) => (r.motion = motion)), anglesDeg: alternatingAngles(8, near, -near), dwellS: 830 };
const close: NightPlan = {
  rig: withRig(closeRig(), (r) => (r.motion = motion)),
  anglesDeg: alternatingAngles(8, closeNear, 180 - closeNear),
  dwellS: 818,
};

const evaluated = (plan: NightPlan) => evaluateNight(plan).result;

describe.each([
  ['wide', wide],
  ['close', close],
])('on the %s rig', (_name, plan) => {
  test.each([0.5, -7.5, 60, -98])('a clock that is %d s late is found and put right', (channelLateS) => {
    const { alignment, G, warnings } = evaluated({ ...plan, channelLateS });
    expect(Math.abs((alignment?.clockOffset_s?.value ?? NaN) - channelLateS)).toBeLessThan(0.1);
    if (Math.abs(channelLateS) < 10) expect(alignment?.clockOffset_s?.value).toBeCloseTo(channelLateS, 3);
    expect(alignment?.applied).toBe(true);
    expect(warnings.map(({ code }) => code)).toContain('clock-offset');
    expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
  });

  test('a clock that is right is left alone', () => {
    const { alignment, warnings } = evaluated(plan);
    expect(Math.abs(alignment?.clockOffset_s?.value ?? NaN)).toBeLessThan(1e-3);
    expect(alignment?.applied).toBe(false);
    expect(warnings.map(({ code }) => code)).not.toContain('clock-offset');
  });
});

test('with 5 µrad of noise at 1 Hz the offset is known to some ms, and its uncertainty covers it', () => {
  const normal = normalDeviates(23);
  const { alignment } = evaluated({ ...wide, channelLateS: 0.25, reading: (angle) => angle + 5e-6 * normal() });
  const { value, u } = alignment?.clockOffset_s ?? { value: NaN, u: NaN };
  // 5.5 ms a swing at 10 Hz with all else left free (H3), so 17 ms at 1 Hz and 6 ms from eight swings.
  expect(u).toBeGreaterThan(0.001);
  expect(u).toBeLessThan(0.02);
  expect(Math.abs(value - 0.25)).toBeLessThan(3 * u);
});

describe('what somebody decides about a clock that is 98 s early', () => {
  const late: NightPlan = { ...wide, channelLateS: -98 };
  const decided = (clock: ClockChoice | undefined) =>
    evaluateNight(late, { besides: true, ...(clock === undefined ? {} : { clock }) }).result;

  test('left as it is, G comes out wrong, and the result says what it would be with the offset taken off', () => {
    const { alignment, G, warnings } = decided({ kind: 'left' });
    expect(alignment).toMatchObject({ applied: false, decided: { kind: 'left' } });
    expect(alignment?.clockOffset_s?.value).toBeCloseTo(-98, 0);
    expect(relativeDifference(G?.value ?? NaN, trueG)).toBeGreaterThan(1e-6);
    expect(relativeDifference(alignment?.otherwise?.G ?? NaN, trueG)).toBeLessThan(1e-7);
    expect(warnings.find(({ code }) => code === 'clock-offset')?.message).toContain('left as it is, as was asked for');
  });

  test('set by what is known from elsewhere, G is right, and the result says what it would be without', () => {
    const { alignment, G } = decided({ kind: 'set', offset_s: -98 });
    expect(alignment).toMatchObject({ applied: true, decided: { kind: 'set', offset_s: -98 }, otherwise: { offset_s: 0 } });
    expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
    expect(alignment?.otherwise?.G).toBe(decided({ kind: 'left' }).G?.value);
  });

  test('accepted, it is the same as no decision, and says what leaving it would cost', () => {
    const accepted = decided({ kind: 'estimated' });
    expect(accepted).toEqual(decided(undefined));
    expect(accepted.alignment?.decided).toBeUndefined();
    expect(accepted.alignment?.otherwise).toEqual({ offset_s: 0, G: decided({ kind: 'left' }).G?.value });
  });
});

test('a still night tells no offset', () => {
  const plan: NightPlan = { ...wide, anglesDeg: [near, near, near, near] };
  const { alignment } = evaluateNight(plan, {}, (records) => ({
    ...records,
    steps: records.steps.filter(({ kind }) => kind !== 'swing'),
  })).result;
  expect(alignment).toEqual({ clockOffset_s: null, applied: false });
});

describe('swings in two moves, which leave the pendulum nearly at rest', () => {
  const twoMoves: NightPlan['shaped'] = (fromDeg) => ({ viaDeg: fromDeg < 0 ? 1.094 : -1.094, afterS: 210.9 });
  const shaped: NightPlan = { ...wide, dwellS: 630, channelLateS: 3, shaped: twoMoves };
  const noisy = (plan: NightPlan) => {
    const normal = normalDeviates(23);
    const { alignment, warnings } = evaluated({ ...plan, reading: (angle) => angle + 2e-5 * normal() });
    return {
      ...(alignment?.clockOffset_s ?? { value: NaN, u: NaN }),
      applied: alignment?.applied,
      codes: warnings.map(({ code }) => code),
    };
  };

  test('tell the clock poorly: the result says so and takes nothing off', () => {
    const { value, u, applied, codes } = noisy(shaped);
    expect(u).toBeGreaterThan(1);
    expect(Math.abs(value - 3)).toBeLessThan(3 * u);
    expect(applied).toBe(false);
    expect(codes).toContain('clock-poorly-known');
    expect(codes).not.toContain('clock-offset');
  });

  test('after three plain ones tell it well', () => {
    let swings = 0;
    const plainS = 9.73;
    const mixed: NightPlan['shaped'] = (fromDeg, toDeg) => {
      swings += 1;
      return swings <= 3 ? { viaDeg: toDeg, afterS: plainS } : twoMoves(fromDeg, toDeg);
    };
    const { value, u, applied, codes } = noisy({ ...shaped, shaped: mixed });
    expect(u).toBeLessThan(0.2);
    expect(Math.abs(value - 3)).toBeLessThan(4 * u);
    expect(applied).toBe(true);
    expect(codes).not.toContain('clock-poorly-known');
  });

  test('without noise tell it as well as plain ones', () => {
    const { alignment, warnings } = evaluated(shaped);
    expect(alignment?.clockOffset_s?.value).toBeCloseTo(3, 2);
    expect(warnings.map(({ code }) => code)).not.toContain('clock-poorly-known');
  });
});
