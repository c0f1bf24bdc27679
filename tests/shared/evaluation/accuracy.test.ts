import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { alternatingAngles, type NightPlan } from '../../support/night';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/**
 * The error of the software: noise-free archives of exactly known rigs, made by the independent integrator of tests/support, must give
 * back the G that they were made with to 1e-7. Period and decay time are not told.
 */

const trueG = 6.6743e-11;
const degrees = (rad: number) => (rad * 180) / Math.PI;
const near = degrees(wideSourceAngleRad);
const closeNear = degrees(closeSourceAngleRad);
const metres = (value: number) => ({ value, u: 0, unit: 'm' as const });
const deg = (value: number) => ({ value, u: 0, unit: 'deg' as const });

/** Decay time of the amplitude, s, for a quality factor at a damped period of 420 s (physics.md A8). */
function decayOf(quality: number): number {
  const zeta = 1 / (2 * quality);
  return Math.sqrt(1 - zeta * zeta) / (zeta * ((2 * Math.PI) / 420));
}

const wide: NightPlan = { rig: wideRig(), anglesDeg: alternatingAngles(8, near, -near), dwellS: 830 };
const close: NightPlan = { rig: closeRig(), anglesDeg: alternatingAngles(8, closeNear, 180 - closeNear), dwellS: 818 };

const cylinders = (rig: RigDocument, heightM: number) =>
  withRig(rig, (r) => (r.sources = { ...r.sources, shape: 'cylinder', radius: metres(0.03), height: metres(heightM) }));

const shaped = (k: number, halfPeriodS: number) => (fromDeg: number, toDeg: number) => ({
  viaDeg: fromDeg + (toDeg - fromDeg) * k,
  afterS: halfPeriodS,
});

const cases: [string, NightPlan][] = [
  ['wide, Q 3', { ...wide, decayTimeS: decayOf(3) }],
  ['wide, Q 300, a beat that pumps', { ...wide, decayTimeS: decayOf(300), dwellS: 610 }],
  ['wide, Q 8, dwells of hardly more than a period', { ...wide, dwellS: 450 }],
  ['close, Q 8', close],
  ['close, Q 30, a beat that pumps', { ...close, decayTimeS: decayOf(30), dwellS: 610 }],
  ['close, Q 300', { ...close, decayTimeS: decayOf(300) }],
  ['close, swings in two moves', { ...close, shaped: shaped(0.5, 210) }],
  [
    'wide, cylinders, sources 4 mm high',
    { ...wide, rig: withRig(cylinders(wideRig(), 0.0525), (r) => (r.sources.offset = metres(0.004))) },
  ],
  ['close, flat cylinders', { ...close, rig: cylinders(closeRig(), 0.03) }],
  [
    'wide, 40 degrees, spot in mm on the wrong side of its zero',
    {
      ...wide,
      rig: withRig(wideRig(), (r) => {
        r.stations = { near: deg(40), far: deg(-40) };
        r.lever = { distance: metres(3.2), fold: 2, sense: -1, zero: metres(0.05) };
      }),
      anglesDeg: alternatingAngles(8, 40, -40),
      unit: 'mm',
      reading: (angle) => 1000 * (0.05 - 3.2 * Math.tan(2 * (angle + 0.011))),
    },
  ],
  [
    'wide, spot in m without a given zero, slow turntable',
    { ...wide, unit: 'm', reading: (angle) => 0.7 + 5 * Math.tan(2 * angle), speedDegS: 1, accelerationDegS2: 0.3 },
  ],
];

test.each(cases)('%s', (_name, plan) => {
  const unmeasured = withRig(plan.rig as RigDocument, (r) => delete r.measured);
  const { result } = evaluateNight({ ...plan, rig: unmeasured });
  expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
  expect(result.period_s?.value).toBeCloseTo(420, 4);
});
