import { torquePerG, geometryOf } from '@/shared/physics/torque';
import { oscillatorOf } from '@/shared/physics/oscillator';
import { trapezoid } from '@/shared/physics/trapezoid';
import type { Step } from '@/shared/protocol/document';
import { predictDeflection, predictEquilibriumRad, predictSignal } from '@/shared/protocol/predict';
import { templates, withoutSources } from '@/shared/protocol/templates';
import { planTimeline, type Timeline } from '@/shared/protocol/timeline';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** The demo rig with its stations put exactly where the design reference has them (sections 0 and A4, verified there independently). */
const referenceRig = (rig: RigDocument, nearDeg: number, farDeg: number): RigDocument => ({
  ...rig,
  stations: { near: { value: nearDeg, u: 0.05, unit: 'deg' }, far: { value: farDeg, u: 0.05, unit: 'deg' } },
});
const wide = referenceRig(demoRigWide, 20.1808283867, -20.1808283867);
const narrow = referenceRig(demoRigNarrow, 32.61924307119, 180 - 32.61924307119);

describe('the signal', () => {
  test('near minus far equals the reference on both rigs', () => {
    // Design reference A4: S = 0.002373825686861 (W), 0.005369605153482 (N).
    expect((predictSignal(wide)?.signalRad ?? 0) / 0.002373825686861).toBeCloseTo(1, 9);
    expect((predictSignal(narrow)?.signalRad ?? 0) / 0.005369605153482).toBeCloseTo(1, 9);
  });

  test('the equilibrium at near equals the reference', () => {
    expect((predictEquilibriumRad(wide, 20.1808283867) ?? 0) / 0.001186912843431).toBeCloseTo(1, 9);
    expect((predictEquilibriumRad(narrow, 32.61924307119) ?? 0) / 0.002684802576741).toBeCloseTo(1, 9);
  });

  test('on the scale it is the exact tangent', () => {
    // Design reference A5: 0.05369656760743 m on rig N at 5 m.
    expect((predictSignal(narrow)?.signalM ?? 0) / 0.05369656760743).toBeCloseTo(1, 9);
  });

  test('a lever that reads backwards turns the sign on the scale only', () => {
    const backwards = { ...wide, lever: { ...(wide.lever as NonNullable<RigDocument['lever']>), sense: -1 as const } };
    expect(predictSignal(backwards)?.signalM).toBeCloseTo(-(predictSignal(wide)?.signalM ?? 0), 15);
    expect(predictSignal(backwards)?.signalRad).toBe(predictSignal(wide)?.signalRad);
  });

  test('is null where something is missing, zero with the spheres off', () => {
    expect(predictSignal({ ...wide, measured: undefined })).toBeNull();
    expect(predictSignal({ ...wide, stations: {} })).toBeNull();
    expect(predictSignal({ ...wide, lever: undefined })?.signalM).toBeNull();
    expect(predictSignal(withoutSources(wide))?.signalRad).toBeCloseTo(0, 15);
  });
});

/** The exact pendulum, I θ̈ = −2Iγ θ̇ − κ θ + G g(φ − θ), by fixed steps of Runge and Kutta: what the prediction is held against. */
function integrated(rig: RigDocument, timeline: Timeline, stepS: number): { utcMs: number; rad: number }[] {
  const free = oscillatorOf(rig);
  if (free === null) throw new Error('the rig has no period');
  const geometry = geometryOf(rig);
  const moves = timeline.items.map((item) => ({
    item,
    angle: trapezoid({
      fromDeg: item.angleFromDeg,
      toDeg: item.angleToDeg,
      speedDegS: item.speedDegS ?? 1,
      accelerationDegS2: item.accelerationDegS2 ?? 1,
    }),
  }));
  let at = 0;
  const angleDeg = (utcMs: number) => {
    while (at < moves.length - 1 && (moves[at]?.item.endUtcMs ?? 0) <= utcMs) at += 1;
    const move = moves[at];
    return move === undefined ? 0 : move.angle.angleDegAt((utcMs - move.item.startUtcMs) / 1000);
  };
  const acceleration = (x: number, v: number, phiDeg: number) =>
    (6.6743e-11 * torquePerG(geometry, (phiDeg * Math.PI) / 180 - x)) / free.inertiaKgM2 - 2 * free.gamma * v - free.omega0 ** 2 * x;
  const rows: { utcMs: number; rad: number }[] = [];
  let [x, v] = [predictEquilibriumRad(rig, timeline.items[0]?.angleFromDeg ?? 0) ?? 0, 0];
  for (let t = 0; t < timeline.durationS; t += stepS) {
    rows.push({ utcMs: timeline.startUtcMs + t * 1000, rad: x });
    const [a, m, b] = [t, t + stepS / 2, t + stepS].map((s) => angleDeg(timeline.startUtcMs + s * 1000)) as [number, number, number];
    const k1 = acceleration(x, v, a);
    const k2 = acceleration(x + (v * stepS) / 2, v + (k1 * stepS) / 2, m);
    const k3 = acceleration(x + (v * stepS) / 2 + (k1 * stepS * stepS) / 4, v + (k2 * stepS) / 2, m);
    const k4 = acceleration(x + v * stepS + (k2 * stepS * stepS) / 2, v + k3 * stepS, b);
    x += v * stepS + ((k1 + k2 + k3) * stepS * stepS) / 6;
    v += ((k1 + 2 * k2 + 2 * k3 + k4) * stepS) / 6;
  }
  return rows;
}

const swing = (to: string): Step => ({ kind: 'swing', to });
const dwell: Step = { kind: 'dwell', beat_periods: 2 };
const still: Step = { kind: 'dwell', for_s: 900 };
const reversals: Step[] = [
  { kind: 'home' },
  swing('near'),
  { kind: 'repeat', times: 2, steps: [swing('far'), dwell, swing('near'), dwell] },
];

describe('the deflection over a timeline', () => {
  test.each([
    ['reversals on the wide rig', demoRigWide, 0.01, reversals],
    ['reversals on the close rig', demoRigNarrow, 0.02, reversals],
    [
      'a rotation near resonance on the wide rig',
      demoRigWide,
      0.05,
      [swing('near'), { kind: 'rotate', period_s: 900, turns: 3 } as Step, still],
    ],
  ])('follows the exact pendulum through %s within a few hundredths of the step', (_, rig, share, steps) => {
    const timeline = planTimeline({ protocol: { steps }, rig, timeZone: 'UTC' }, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
    const exact = integrated(rig, timeline, 0.5);
    const predicted = predictDeflection(rig, timeline, 400);
    const signal = predictSignal(rig)?.signalRad ?? 0;
    expect(predicted?.utcMs).toHaveLength(400);
    for (const [index, utcMs] of (predicted?.utcMs ?? []).entries()) {
      const row = exact[Math.min(exact.length - 1, Math.round(utcMs / 500))];
      // Half a second of the fastest swinging (S times the angular frequency) is added for the grid of the comparison.
      expect(Math.abs((predicted?.rad[index] ?? 0) - (row?.rad ?? 0))).toBeLessThan(share * signal + 0.25 * signal * 0.015);
    }
  });

  test('stands at the equilibrium while nothing moves', () => {
    const timeline = planTimeline(
      { protocol: { steps: [{ kind: 'dwell', for_s: 3600 }] }, rig: demoRigWide, timeZone: 'UTC' },
      { utcMs: 0, angleDeg: 20.18 },
    );
    const predicted = predictDeflection(demoRigWide, timeline, 11);
    const rest = predictEquilibriumRad(demoRigWide, 20.18) ?? 0;
    for (const rad of predicted?.rad ?? []) expect(rad).toBeCloseTo(rest, 15);
    expect(predicted?.equilibriumRad).toEqual(Array.from({ length: 11 }, () => rest));
  });

  test('overshoots a step by exp(−γT/2) half a period after it', () => {
    // A textbook fact; Q = 8 gives 0.8214 (design reference A8). The move is made short so that it counts as a step.
    const base = demoRigWide.motion as NonNullable<RigDocument['motion']>;
    const rig: RigDocument = { ...demoRigWide, motion: { ...base, maxSpeed_deg_s: 400, maxAcceleration_deg_s2: 4000 } };
    const timeline = planTimeline(
      { protocol: { steps: [swing('near'), { kind: 'dwell', for_s: 2100 }] }, rig, timeZone: 'UTC' },
      { utcMs: 0, angleDeg: -20.18 },
    );
    const predicted = predictDeflection(rig, timeline, 21_001);
    const [near, far] = [predictEquilibriumRad(rig, 20.18) ?? 0, predictEquilibriumRad(rig, -20.18) ?? 0];
    const highest = Math.max(...(predicted?.rad ?? []));
    expect((highest - near) / (near - far)).toBeCloseTo(0.8214, 3);
  });

  test('is null for a rig without a period, and for an angle at which the sources would hit the pendulum', () => {
    const timeline = planTimeline({ protocol: { steps: reversals }, rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
    expect(predictDeflection({ ...demoRigWide, measured: undefined }, timeline, 10)).toBeNull();
    const touching = { ...demoRigNarrow, measured: { ...demoRigNarrow.measured, period_s: { value: 4200, u: 1, unit: 's' as const } } };
    const into = planTimeline(
      { protocol: { steps: [{ kind: 'swing', to: { angle_deg: 1 } }] }, rig: touching, timeZone: 'UTC' },
      { utcMs: 0, angleDeg: 90 },
    );
    expect(predictDeflection(touching, into, 10)).toBeNull();
  });

  test.each(templates.map((template) => [template.id, template] as const))('covers the whole of %s', (_, template) => {
    const timeline = planTimeline({ protocol: template.make(demoRigWide), rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
    const predicted = predictDeflection(demoRigWide, timeline, 1200);
    expect(predicted?.utcMs).toHaveLength(1200);
    expect(predicted?.utcMs[0]).toBe(timeline.startUtcMs);
    expect(predicted?.utcMs.at(-1)).toBeCloseTo(timeline.endUtcMs, 6);
    expect([...(predicted?.rad ?? [Number.NaN]), ...(predicted?.equilibriumRad ?? [])].every(Number.isFinite)).toBe(true);
  });
});
