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

const dwells = 8;
const cylinders = (rig: RigDocument, heightM: number) =>
  withRig(rig, (r) => (r.sources = { ...r.sources, shape: 'cylinder', radius: metres(0.03), height: metres(heightM) }));

/** Two moves to a swing: half the way, and on after half a period. */
const shaped = (fromDeg: number, toDeg: number) => ({ viaDeg: (fromDeg + toDeg) / 2, afterS: 210 });

/** Of a spot on a scale, the pendulum 11 mrad from the line perpendicular to it. */
const spot =
  (distanceM: number, fold: number, { zero, sense }: { zero: number; sense: 1 | -1 }) =>
  (angle: number) =>
    zero + sense * distanceM * Math.tan(fold * (angle + 0.011));

interface Geometry {
  rig: RigDocument;
  nearDeg: number;
  farDeg: number;
  dwellS: number;
}

/** What a night is made of; its name stands before each. */
const axes = {
  geometry: {
    close: { rig: closeRig(), nearDeg: closeNear, farDeg: 180 - closeNear, dwellS: 818 },
    wide: { rig: wideRig(), nearDeg: near, farDeg: -near, dwellS: 830 },
    'light and unequal': {
      rig: withRig(wideRig(), (r) => {
        r.pendulum = { ...r.pendulum, arm: metres(0.06), ballMass: { value: 0.012, u: 0, unit: 'kg' }, beamLength: metres(0.11) };
        r.sources.orbit = metres(0.108);
      }),
      nearDeg: 33,
      farDeg: -27,
      dwellS: 830,
    },
  } satisfies Record<string, Geometry>,
  shape: { spheres: (rig: RigDocument) => rig, cylinders: (rig: RigDocument) => cylinders(rig, 0.0525) },
  offset: { 'at one height': 0, '4 mm high': 0.004 },
  quality: { 'Q 3': 3, 'Q 8': 8, 'Q 30': 30, 'Q 300': 300 },
  swing: { plain: undefined, 'in two moves': shaped },
  reading: {
    rad: { unit: 'rad', of: (angle: number) => angle },
    mrad: { unit: 'mrad', of: (angle: number) => 1e3 * angle },
    µrad: { unit: 'urad', of: (angle: number) => 1e6 * angle },
    'm, zero not told': {
      unit: 'm',
      lever: { distance: metres(5), fold: 2, sense: 1 },
      of: (angle: number) => 0.7 + 5 * Math.tan(2 * angle),
    },
    'm, its zero told': {
      unit: 'm',
      lever: { distance: metres(2.5), fold: 2, sense: 1, zero: metres(-0.02) },
      of: spot(2.5, 2, { zero: -0.02, sense: 1 }),
    },
    'mm, on the wrong side of its zero': {
      unit: 'mm',
      lever: { distance: metres(3.2), fold: 2, sense: -1, zero: metres(0.05) },
      of: (angle: number) => 1e3 * spot(3.2, 2, { zero: 0.05, sense: -1 })(angle),
    },
    'mm, a beam that turns once': {
      unit: 'mm',
      lever: { distance: metres(4), fold: 1, sense: 1, zero: metres(0) },
      of: (angle: number) => 1e3 * spot(4, 1, { zero: 0, sense: 1 })(angle),
    },
  } satisfies Record<string, { unit: string; lever?: RigDocument['lever']; of: (angle: number) => number }>,
} as const;

type Axis = keyof typeof axes;
type Case = Record<Axis, string>;
const names = Object.keys(axes) as Axis[];

const every: Case[] = names.reduce<Case[]>(
  (cases, axis) => cases.flatMap((one) => Object.keys(axes[axis]).map((level) => ({ ...one, [axis]: level }))),
  [{} as Case],
);

/** As few as a greedy choice finds, so that any two levels of two axes come together in one of them. */
function everyPair(): Case[] {
  const pairsOf = (one: Case) => names.flatMap((a, i) => names.slice(i + 1).map((b) => `${a} ${one[a]} / ${b} ${one[b]}`));
  const missing = new Set(every.flatMap(pairsOf));
  const chosen: Case[] = [];
  while (missing.size > 0) {
    const gain = (one: Case) => pairsOf(one).filter((pair) => missing.has(pair)).length;
    const best = every.reduce((a, b) => (gain(b) > gain(a) ? b : a));
    for (const pair of pairsOf(best)) missing.delete(pair);
    chosen.push(best);
  }
  return chosen;
}

function nightOf(one: Case): NightPlan {
  const level = <A extends Axis>(axis: A) => (axes[axis] as Record<string, unknown>)[one[axis]] as (typeof axes)[A][keyof (typeof axes)[A]];
  const { rig, nearDeg, farDeg, dwellS } = level('geometry') as Geometry;
  const reading = level('reading') as { unit: string; lever?: RigDocument['lever']; of: (angle: number) => number };
  const built = withRig(level('shape')(rig), (r) => {
    r.sources.offset = metres(level('offset'));
    r.stations = { near: deg(nearDeg), far: deg(farDeg) };
    if (reading.lever !== undefined) r.lever = reading.lever;
  });
  const swing = level('swing');
  return {
    rig: built,
    anglesDeg: alternatingAngles(dwells, nearDeg, farDeg),
    dwellS: swing === undefined ? dwellS : dwellS - 210,
    decayTimeS: decayOf(level('quality')),
    unit: reading.unit,
    reading: reading.of,
    ...(swing === undefined ? {} : { shaped: swing }),
  };
}

const wide: NightPlan = { rig: wideRig(), anglesDeg: alternatingAngles(dwells, near, -near), dwellS: 830 };
const close: NightPlan = { rig: closeRig(), anglesDeg: alternatingAngles(dwells, closeNear, 180 - closeNear), dwellS: 818 };

/** Further nights: beats that pump, short dwells, a flat cylinder, a slow turntable. */
const others: [string, NightPlan][] = [
  ['wide, Q 300, a beat that pumps', { ...wide, decayTimeS: decayOf(300), dwellS: 610 }],
  ['wide, Q 8, dwells of hardly more than a period', { ...wide, dwellS: 450 }],
  ['close, Q 30, a beat that pumps', { ...close, decayTimeS: decayOf(30), dwellS: 610 }],
  ['close, flat cylinders', { ...close, rig: cylinders(closeRig(), 0.03) }],
  ['wide, slow turntable', { ...wide, speedDegS: 1, accelerationDegS2: 0.3 }],
];

function expectTrueG(plan: NightPlan) {
  const unmeasured = withRig(plan.rig as RigDocument, (r) => delete r.measured);
  const { result } = evaluateNight({ ...plan, rig: unmeasured });
  expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
  expect(result.period_s?.value).toBeCloseTo(420, 4);
}

test.each(others)('%s', (_name, plan) => expectTrueG(plan));

// EVENFALL_EXACT_NIGHTS=all makes every combination, a quarter of an hour.
const combined = process.env['EVENFALL_EXACT_NIGHTS'] === 'all' ? every : everyPair();
test.each(combined.map((one): [string, Case] => [names.map((axis) => one[axis]).join(', '), one]))('%s', (_name, one) =>
  expectTrueG(nightOf(one)),
);
