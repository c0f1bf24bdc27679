import type { BudgetLine, EvaluationResult } from '@/shared/evaluation/result';
import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

const near = (wideSourceAngleRad * 180) / Math.PI;
const closeNear = (closeSourceAngleRad * 180) / Math.PI;
const wide: NightPlan = { anglesDeg: alternatingAngles(8, near, -near), dwellS: 900 };
const close: NightPlan = { rig: closeRig(), anglesDeg: alternatingAngles(8, closeNear, 180 - closeNear), dwellS: 900 };

function line(result: EvaluationResult, input: string) {
  const found = result.budget?.find((one) => one.input === input);
  if (found === undefined) throw new Error(`no budget line ${input}`);
  return found;
}

/** Relative change of G for a change of one input. */
function effect(result: EvaluationResult, input: string, change: number): number {
  return (line(result, input).sensitivity * change) / (result.G?.value ?? NaN);
}

describe('the sensitivities', () => {
  // Independent budget of the wide rig: lengths 0.1 mm, arm 0.05 mm, source 0.1 g, ball and beam 10 mg, period 0.1 s, shift 2 µrad, angle 0.05 deg.
  test.each([
    ['sources.orbit', 1e-4, 0.0037718604],
    ['pendulum.arm', 5e-5, -0.0011497145],
    ['sources.mass', 1e-4, -6.25e-5],
    ['pendulum.ballMass', 1e-5, -4.661642851e-6],
    ['pendulum.beamMass', 1e-5, 2.33082145e-5],
    ['period_s', 0.1, -0.00047433036],
    ['reversal_rad', 2e-6, 0.00084253524],
  ])('of the wide rig to %s is as published', (input, change, expected) => {
    const { result } = evaluateNight(wide);
    // The published figures are differences over the whole change, these are derivatives: a curvature of 1e-3 between them.
    expect(relativeDifference(effect(result, input, change), expected)).toBeLessThan(2e-3);
  });

  test('of the wide rig per relative change are as published to more digits', () => {
    const { result } = evaluateNight(wide);
    expect(relativeDifference(effect(result, 'sources.orbit', 0.125), 4.714825474687)).toBeLessThan(2e-6);
    expect(relativeDifference(effect(result, 'pendulum.arm', 0.075), -1.724571735955)).toBeLessThan(2e-6);
  });

  test('to mirrored station angles is small at the greatest torque, and of the published size on the close rig', () => {
    const wideResult = evaluateNight(wide).result;
    expect(effect(wideResult, 'stations.near', 0.05) - effect(wideResult, 'stations.far', 0.05)).toBeCloseTo(-1.1685721e-5, 8);
    const closeResult = evaluateNight(close).result;
    expect(
      relativeDifference(effect(closeResult, 'stations.near', 0.05) - effect(closeResult, 'stations.far', 0.05), 0.002821804),
    ).toBeLessThan(2e-3);
    expect(Math.abs(effect(closeResult, 'stations.near', 0.05) + effect(closeResult, 'stations.far', 0.05))).toBeLessThan(1e-5);
  });

  test('of the close rig to period, shift and source mass are as published', () => {
    const { result } = evaluateNight(close);
    expect(relativeDifference(effect(result, 'period_s', 420), -1.9921875)).toBeLessThan(1e-6);
    expect(relativeDifference(effect(result, 'reversal_rad', result.reversal_rad?.value ?? NaN), 0.9913185583)).toBeLessThan(1e-5);
    expect(relativeDifference(effect(result, 'sources.mass', 1.6), -1)).toBeLessThan(1e-6);
    // Orbit at fixed angles, as in rig.json: 0.0023 for 0.1 mm.
    expect(Math.abs(effect(result, 'sources.orbit', 1e-4) - 0.0023)).toBeLessThan(1e-4);
  });

  // The zero bends the scale a little, under the ringing too, which one reading for each dwell does not show.
  test.each([
    ['sources.orbit', (r: RigDocument, h: number) => ((r.sources.orbit as { value: number }).value += h), 2e-5, 3e-4],
    ['pendulum.arm', (r: RigDocument, h: number) => (r.pendulum.arm.value += h), 2e-5, 3e-4],
    ['pendulum.ballRadius', (r: RigDocument, h: number) => (r.pendulum.ballRadius.value += h), 1e-5, 3e-4],
    ['pendulum.beamLength', (r: RigDocument, h: number) => (r.pendulum.beamLength.value += h), 1e-4, 3e-4],
    ['lever.distance', (r: RigDocument, h: number) => ((r.lever as { distance: { value: number } }).distance.value += h), 1e-3, 3e-4],
    ['lever.zero', (r: RigDocument, h: number) => ((r.lever as { zero: { value: number } }).zero.value += h), 1e-3, 2e-2],
  ])('to %s is what a whole new evaluation of the same data gives', (...[input, change, h, tolerance]) => {
    // No measured period: κ comes from the ring-down alone, so its correction for the sources' stiffness is part of the derivative.
    const rig = withRig(closeRig(), (r) => {
      delete r.measured;
      r.lever = { distance: { value: 5, u: 0.002, unit: 'm' }, fold: 2, sense: 1, zero: { value: -0.05, u: 0.001, unit: 'm' } };
    });
    const reading = (angle: number) => -0.05 + 5 * Math.tan(2 * (angle + 0.004));
    const evaluated = (supposed: RigDocument) =>
      evaluateNight({ ...close, rig, reading, unit: 'm' }, {}, (records) => ({ ...records, rig: supposed })).result;
    const shifted = (step: number) => evaluated(withRig(rig, (r) => void change(r, step))).G?.value as number;
    expect(relativeDifference(line(evaluated(rig), input).sensitivity, (shifted(h) - shifted(-h)) / (2 * h))).toBeLessThan(tolerance);
  });
});

describe('the budget', () => {
  const uncertain = withRig(wideRig(), (r) => {
    const set = (q: { u: number } | undefined, u: number) => Object.assign(q as { u: number }, { u });
    set(r.sources.orbit, 1e-4);
    set(r.pendulum.arm, 5e-5);
    set(r.sources.mass, 1e-4);
    set(r.stations.near, 0.05);
    set(r.stations.far, 0.05);
    r.measured = { period_s: { value: 420, u: 0.1, unit: 's' }, decayTime_s: { value: 1067.43, u: 27, unit: 's' } };
  });

  test('adds up: contribution is sensitivity times u, shares sum to one, u of G is the root of the sum of squares', () => {
    const { result } = evaluateNight({ ...wide, rig: uncertain });
    const lines = result.budget ?? [];
    for (const one of lines.filter(({ input }) => !input.startsWith('correlation.')))
      expect(one.contribution).toBeCloseTo(Math.abs(one.sensitivity) * one.u, 25);
    expect(lines.reduce((sum, { share }) => sum + share, 0)).toBeCloseTo(1, 12);
    const root = Math.sqrt(lines.reduce((sum, { contribution, share }) => sum + Math.sign(share) * contribution ** 2, 0));
    expect(relativeDifference(result.G?.u ?? NaN, root)).toBeLessThan(1e-12);
    expect(relativeDifference(result.relativeU ?? NaN, (result.G?.u ?? NaN) / (result.G?.value ?? NaN))).toBeLessThan(1e-12);
    expect(lines.map(({ input }) => input)).toEqual(
      expect.arrayContaining([
        'pendulum.arm',
        'sources.orbit',
        'sources.mass',
        'stations.near',
        'stations.far',
        'reversal_rad',
        'period_s',
        'decayTime_s',
      ]),
    );
    // Geometry of a tenth of a millimetre decides: 0.377 % from the orbit and 0.115 % from the arm.
    expect(relativeDifference(result.relativeU ?? NaN, Math.hypot(0.0037718604, 0.0011497145, 6.25e-5))).toBeLessThan(4e-3);
  });

  test('near minus far and the period of the same dwells err together: a line says by how much, and Monte Carlo trials find the same u', () => {
    const normal = normalDeviates(19);
    const unmeasured = withRig(wideRig(), (r) => void delete r.measured);
    const { result } = evaluateNight(
      { ...wide, rig: unmeasured, anglesDeg: alternatingAngles(24, near, -near), reading: (angle) => angle + 5e-6 * normal() },
      { trials: 100_000 },
    );
    const lines = new Map((result.budget ?? []).map((line) => [line.input, line]));
    const [difference, period] = ['reversal_rad', 'period_s'].map((input) => lines.get(input)) as [BudgetLine, BudgetLine];
    const together = lines.get('correlation.reversal_rad.period_s') as BudgetLine;
    // A period found too long makes a difference found too small (ringing in opposite senses), and G goes with S/T²: both lower it.
    expect(together.value).toBeLessThan(-0.1);
    expect(together.value).toBeGreaterThan(-0.7);
    expect(together.share).toBeGreaterThan(0);
    // JCGM 100:2008, 5.2.2: 2 r cᵢ cⱼ uᵢ uⱼ.
    const square = 2 * together.value * difference.sensitivity * difference.u * period.sensitivity * period.u;
    expect(relativeDifference(together.contribution ** 2, square)).toBeLessThan(1e-9);
    // Trials draw from Student's laws, whose spread is greater by √(ν/(ν − 2)).
    const ratio = (result.monteCarlo?.G_u ?? NaN) / (result.G?.u ?? NaN);
    expect(ratio).toBeGreaterThan(0.99);
    expect(ratio).toBeLessThan(1.08);
  });

  test('lets inputs of one group share their error, so that it adds or cancels', () => {
    const grouped = withRig(uncertain, (r) => {
      Object.assign(r.sources.orbit as object, { group: 'calliper' });
      Object.assign(r.pendulum.arm, { group: 'calliper' });
    });
    const { result } = evaluateNight({ ...wide, rig: grouped });
    // Opposite signs: 0.377 % − 0.115 %.
    expect(relativeDifference(result.relativeU ?? NaN, Math.hypot(0.0037718604 - 0.0011497145, 6.25e-5))).toBeLessThan(3e-3);
  });

  test('has the degrees of freedom of Welch and Satterthwaite', () => {
    const few = withRig(uncertain, (r) => void Object.assign(r.sources.orbit as object, { nu: 4 }));
    const { result } = evaluateNight({ ...wide, rig: few });
    const share = (0.0037718604 / (result.relativeU ?? NaN)) ** 2;
    expect(relativeDifference(result.G?.degreesOfFreedom ?? NaN, 4 / share ** 2)).toBeLessThan(2e-2);
  });

  test('counts the size of an offset between the axes, to second order', () => {
    const beside = withRig(wideRig(), (r) => (r.axis = { offset: { value: 0, u: 0.001, unit: 'm' } }));
    const twice = withRig(wideRig(), (r) => (r.axis = { offset: { value: 0, u: 0.002, unit: 'm' } }));
    const [one, two] = [beside, twice].map((rig) => line(evaluateNight({ ...wide, rig }).result, 'axis.offset').contribution) as [
      number,
      number,
    ];
    expect(one / 6.6743e-11).toBeGreaterThan(1e-5);
    expect(one / 6.6743e-11).toBeLessThan(1e-3);
    expect(two / one).toBeCloseTo(4, 1);
  });

  test('puts the second order where the first vanishes: height and station angles at the greatest torque', () => {
    const rig = withRig(wideRig(), (r) => {
      Object.assign(r.sources.offset as object, { u: 0.005 });
      r.stations.near = { value: near, u: 0.1, unit: 'deg' };
    });
    const { result } = evaluateNight({ ...wide, rig });
    // Torque ratio 0.9895428 at 5 mm (physics.md A3): G'' u²/2 = 1.05 %, with the standard deviation √2 of a square.
    expect(line(result, 'sources.offset').contribution / 6.6743e-11).toBeCloseTo(Math.SQRT2 * 0.01057, 3);
    // −1.706e-5 of the torque for 0.1° (A3); G takes half of it, because only near is off.
    expect(line(result, 'stations.near').contribution / 6.6743e-11).toBeGreaterThan(0.7 * Math.SQRT2 * 0.853e-5);
  });

  test('agrees with Monte Carlo trials where it is straight, and is corrected by them where it is not', () => {
    const { result } = evaluateNight({ ...wide, rig: uncertain }, { trials: 50_000 });
    const { G_mean, G_u, interval95, trials } = result.monteCarlo as NonNullable<EvaluationResult['monteCarlo']>;
    expect(trials).toBe(50_000);
    const [from, to] = interval95 ?? [NaN, NaN];
    expect(relativeDifference(G_u ?? NaN, result.G?.u ?? NaN)).toBeLessThan(0.02);
    expect(Math.abs((G_mean ?? NaN) / 6.6743e-11 - 1)).toBeLessThan(2e-4);
    expect(relativeDifference(to - from, 2 * 1.96 * (G_u ?? NaN))).toBeLessThan(0.02);
    const high = withRig(wideRig(), (r) => void Object.assign(r.sources.offset as object, { u: 0.005 }));
    const bent = evaluateNight({ ...wide, rig: high }, { trials: 50_000 }).result.monteCarlo;
    // The mean of a square is its variance: + 1.05 % at 5 mm, and no trial lies below.
    expect((bent?.G_mean ?? 0) / 6.6743e-11 - 1).toBeCloseTo(0.0106, 3);
    expect((bent?.interval95?.[0] ?? 0) / 6.6743e-11).toBeGreaterThan(1 - 1e-6);
  });

  test('leaves the lever out of an angle channel and takes it into a spot channel', () => {
    const inputs = (plan: NightPlan) => (evaluateNight(plan).result.budget ?? []).map(({ input }) => input);
    expect(inputs(wide)).not.toContain('lever.distance');
    const spot = inputs({ ...wide, unit: 'm', reading: (angle) => 5 * Math.tan(2 * angle) });
    expect(spot).toContain('lever.distance');
  });

  test('compares with CODATA in normalised error', () => {
    const { result } = evaluateNight({ ...wide, rig: uncertain, bigG: 6.75e-11 });
    const u = result.G?.u ?? NaN;
    expect(result.codata.En).toBeCloseTo(((result.G?.value ?? NaN) - 6.6743e-11) / (2 * Math.sqrt(u ** 2 + 1.5e-15 ** 2)), 10);
    expect(result.codata).toMatchObject({ value: 6.6743e-11, u: 1.5e-15 });
  });
});

describe('period and decay', () => {
  test('are the mean of ring-down and measurement weighted by u⁻²: the ring-down decides on a quiet night', () => {
    const rig = withRig(wideRig(), (r) => (r.measured = { period_s: { value: 420.2, u: 0.1, unit: 's' } }));
    const { result } = evaluateNight({ ...wide, rig });
    expect(result.period_s?.value).toBeCloseTo(420, 3);
    expect(result.warnings.map(({ code }) => code)).not.toContain('period-disagrees');
  });

  test('a well known period counts in full beside a poorly known decay time, in the torsion constant too', () => {
    const normal = normalDeviates(5);
    const noisy = (r: RigDocument) => evaluateNight({ ...wide, rig: r, reading: (angle) => angle + 1e-5 * normal() }).result;
    const exact = { period_s: { value: 420, u: 0, unit: 's' as const }, decayTime_s: { value: 1067.43, u: 500, unit: 's' as const } };
    const result = noisy(withRig(wideRig(), (r) => (r.measured = exact)));
    expect(result.period_s).toEqual({ value: 420, u: 0 });
    // What is left is the ring-down's γ, a 256th of κ at Q 8.
    expect(relativeDifference(result.kappa_N_m?.value ?? NaN, 5.211972603453e-8)).toBeLessThan(3e-5);
  });

  test('period, decay time and torsion constant belong together', () => {
    const rig = withRig(wideRig(), (r) => (r.measured = { period_s: { value: 420.1, u: 1e-4, unit: 's' } }));
    const { result } = evaluateNight({ ...wide, rig });
    const omega0Squared = ((2 * Math.PI) / (result.period_s?.value ?? NaN)) ** 2 + (result.decayTime_s?.value ?? NaN) ** -2;
    expect(relativeDifference(result.kappa_N_m?.value ?? NaN, 0.000231975 * omega0Squared)).toBeLessThan(1e-9);
  });

  test('that disagree by more than three u are warned of', () => {
    const rig = withRig(wideRig(), (r) => (r.measured = { period_s: { value: 421, u: 0.1, unit: 's' } }));
    expect(evaluateNight({ ...wide, rig }).result.warnings.map(({ code }) => code)).toContain('period-disagrees');
  });

  test('are the measured ones where they are exact', () => {
    const rig = withRig(
      wideRig(),
      (r) => (r.measured = { period_s: { value: 420, u: 0, unit: 's' }, decayTime_s: { value: 1067.43, u: 0, unit: 's' } }),
    );
    expect(evaluateNight({ ...wide, rig }).result.period_s).toEqual({ value: 420, u: 0 });
  });

  test('carry the uncertainty of the inertia into the torsion constant', () => {
    const rig = withRig(wideRig(), (r) => (r.pendulum.ballMass.u = 2e-5));
    const { result } = evaluateNight({ ...wide, rig });
    // κ = I ω₀²; ∂I/∂m = 2 (d² + ⅖ r²), so 0.1 % of the balls' 0.974 share.
    expect(
      relativeDifference((result.kappa_N_m?.u ?? NaN) / (result.kappa_N_m?.value ?? NaN), (1e-3 * 0.0002259) / 0.000231975),
    ).toBeLessThan(1e-3);
  });
});
