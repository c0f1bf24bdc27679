import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import type { StepRow } from '@/shared/archive/run-records';
import type { RigDocument } from '@/shared/rig/document';
import { wideRig } from './reference-rigs';

/**
 * A night of an exactly known rig, written without the program's own physics: attraction between points, the beam as 16
 * Gauss–Legendre points, the motion by Runge–Kutta steps of the exact equation.
 */
export interface NightPlan {
  rig?: RigDocument;
  bigG?: number;
  /** Turntable angles, deg: the first is where the run starts at rest, a swing and a dwell for each further one. */
  anglesDeg: readonly number[];
  /** Length of each dwell, s. */
  dwellS: number;
  rateHz?: number;
  speedDegS?: number;
  accelerationDegS2?: number;
  periodS?: number;
  decayTimeS?: number;
  /** Pendulum angle (rad) at instant t (s) to the reading of the channel; default the angle itself. */
  reading?: (thetaRad: number, tS: number) => number;
  unit?: string;
  /** Where the steps' rows differ from the plain ones. */
  row?: (row: StepRow) => Partial<StepRow>;
  protocol?: BuildArchiveInput['protocol'];
}

/** Looking up a global costs much more under the test runner than using it. */
const { sqrt, sin, cos } = Math;

export const nightStartUtcMs = Date.UTC(2026, 2, 1, 22, 0, 0);

interface Mass {
  massKg: number;
  radiusM: number;
}

const gauss8 = [
  [0.1834346424956498, 0.362683783378362],
  [0.525532409916329, 0.3137066458778873],
  [0.7966664774136267, 0.2223810344533745],
  [0.9602898564975363, 0.1012285362903763],
] as const;

function pointsOf({ pendulum }: RigDocument): Mass[] {
  const half = pendulum.beamLength.value / 2;
  const beam = gauss8.flatMap(([x, w]) =>
    [0.5, -0.5].flatMap((middle) =>
      [1, -1].map((side) => ({ massKg: (pendulum.beamMass.value * w) / 4, radiusM: half * (middle + (side * x) / 2) })),
    ),
  );
  return [1, -1].map((side) => ({ massKg: pendulum.ballMass.value, radiusM: side * pendulum.arm.value })).concat(beam);
}

/** Angular acceleration by the sources at ψ = turntable − pendulum (rad), rad/s2. */
function attraction(rig: RigDocument, bigG: number, inertia: number): (psiRad: number) => number {
  const points = pointsOf(rig);
  const orbit = rig.sources.orbit?.value ?? 1;
  const mass = rig.sources.shape === 'none' ? 0 : (rig.sources.mass?.value ?? 0);
  const height = rig.sources.offset?.value ?? 0;
  const scale = (bigG * mass) / inertia;
  return (psiRad) => {
    const sx = orbit * cos(psiRad);
    const sy = orbit * sin(psiRad);
    let torque = 0;
    for (const { massKg, radiusM } of points) {
      const across = sy * sy + height * height;
      const near = sqrt((sx - radiusM) * (sx - radiusM) + across);
      const far = sqrt((sx + radiusM) * (sx + radiusM) + across);
      torque += massKg * radiusM * sy * (1 / (near * near * near) - 1 / (far * far * far));
    }
    return scale * torque;
  };
}

interface Move {
  startS: number;
  durationS: number;
  fromDeg: number;
  toDeg: number;
}

/** Angle of a trapezoidal move by its own formula: distance covered while accelerating, cruising and braking. */
function angleAt(move: Move, tS: number, limits: { speed: number; acceleration: number }): number {
  const distance = Math.abs(move.toDeg - move.fromDeg);
  const t = Math.min(Math.max(tS - move.startS, 0), move.durationS);
  const ramp = Math.min(limits.speed / limits.acceleration, Math.sqrt(distance / limits.acceleration));
  const t1 = Math.min(t, ramp);
  const t3 = Math.max(0, t - (move.durationS - ramp));
  const t2 = t - t1 - t3;
  const peak = limits.acceleration * ramp;
  const covered = 0.5 * limits.acceleration * t1 * t1 + peak * t2 + peak * t3 - 0.5 * limits.acceleration * t3 * t3;
  return move.fromDeg + Math.sign(move.toDeg - move.fromDeg) * covered;
}

function movesOf(plan: NightPlan, limits: { speed: number; acceleration: number }): Move[] {
  let at = 10;
  return plan.anglesDeg.slice(1).map((toDeg, k) => {
    const fromDeg = plan.anglesDeg[k] as number;
    const distance = Math.abs(toDeg - fromDeg);
    const ramp = Math.min(limits.speed / limits.acceleration, Math.sqrt(distance / limits.acceleration));
    const durationS = distance === 0 ? 0 : ramp + distance / (limits.acceleration * ramp);
    const move = { startS: at, durationS, fromDeg, toDeg };
    at += durationS + plan.dwellS;
    return move;
  });
}

/** The records of the night, ready for `buildArchive`. */
export function night(plan: NightPlan): BuildArchiveInput {
  const rig = plan.rig ?? wideRig();
  const limits = { speed: plan.speedDegS ?? 6, acceleration: plan.accelerationDegS2 ?? 2 };
  const moves = movesOf(plan, limits);
  const last = moves.at(-1);
  const endS = last === undefined ? plan.dwellS : last.startS + last.durationS + plan.dwellS;
  const { utcMs, theta } = motion(plan, rig, { moves, limits, endS });
  const reading = plan.reading ?? ((angle: number) => angle);
  return {
    run: {
      runId: 'night',
      outcome: 'finished',
      operator: 'Wren Alder',
      startedAtUtcMs: nightStartUtcMs,
      endedAtUtcMs: nightStartUtcMs + endS * 1000,
      notes: '',
      massSetLabel: 'lead',
      simulated: null,
    },
    rig,
    protocol: plan.protocol ?? { formatVersion: 1, name: 'Night', steps: [{ kind: 'home' }] },
    steps: moves.flatMap((move, k) => rowsOf(move, plan, 2 * k + 1)),
    events: [],
    channels: [
      {
        info: { name: 'deflection', quantity: 'deflection', unit: plan.unit ?? 'rad', role: 'deflection' },
        utcMs,
        value: theta.map((angle, i) => reading(angle, ((utcMs[i] as number) - nightStartUtcMs) / 1000)),
      },
    ],
    createdAt: '2026-03-02T08:00:00.000Z',
    software: 'test',
  };
}

interface Motion {
  utcMs: Float64Array;
  theta: Float64Array;
}

const motions = new Map<string, Motion>();

/** Many tests look at one and the same motion through other readings, so each is integrated once. */
function motion(
  plan: NightPlan,
  rig: RigDocument,
  course: { moves: Move[]; limits: { speed: number; acceleration: number }; endS: number },
): Motion {
  const { bigG, rateHz, periodS, decayTimeS, anglesDeg } = plan;
  const key = JSON.stringify([rig.pendulum, rig.sources, course, bigG, rateHz, periodS, decayTimeS, anglesDeg[0]]);
  const known = motions.get(key);
  if (known !== undefined) return known;
  const angleDegAt = (tS: number) => {
    const move = course.moves.findLast((one) => one.startS <= tS);
    return move === undefined ? (anglesDeg[0] as number) : angleAt(move, tS, course.limits);
  };
  const found = integrate(plan, rig, { angleDegAt, endS: course.endS });
  motions.set(key, found);
  return found;
}

function rowsOf(move: Move, plan: NightPlan, seq: number): StepRow[] {
  const instant = (tS: number) => nightStartUtcMs + tS * 1000;
  const [start, middle, end] = [move.startS, move.startS + move.durationS, move.startS + move.durationS + plan.dwellS];
  const base = {
    label: '',
    station: '',
    uStartS: 0,
    uEndS: 0,
    outcome: 'done' as const,
    angleSource: 'edge-verified' as const,
    uAngleDeg: 0,
  };
  const times = (from: number, to: number) => ({
    plannedStartUtcMs: instant(from),
    plannedEndUtcMs: instant(to),
    startUtcMs: instant(from),
    endUtcMs: instant(to),
  });
  const rows: StepRow[] = [
    {
      ...base,
      seq,
      path: `1.repeat[${seq}].1.swing`,
      kind: 'swing',
      ...times(start, middle),
      angleStartDeg: move.fromDeg,
      angleEndDeg: move.toDeg,
      good: null,
    },
    {
      ...base,
      seq: seq + 1,
      path: `1.repeat[${seq}].2.dwell`,
      kind: 'dwell',
      ...times(middle, end),
      angleStartDeg: move.toDeg,
      angleEndDeg: move.toDeg,
      good: true,
    },
  ];
  return rows.map((row) => ({ ...row, ...plan.row?.(row) }));
}

function integrate(plan: NightPlan, rig: RigDocument, { angleDegAt, endS }: { angleDegAt: (tS: number) => number; endS: number }): Motion {
  const { pendulum } = rig;
  const inertia =
    2 * pendulum.ballMass.value * (pendulum.arm.value ** 2 + 0.4 * pendulum.ballRadius.value ** 2) +
    (pendulum.beamMass.value * pendulum.beamLength.value ** 2) / 12;
  const gamma = 1 / (plan.decayTimeS ?? 1067.4302650055924);
  const omega0Squared = ((2 * Math.PI) / (plan.periodS ?? 420)) ** 2 + gamma ** 2;
  const pull = attraction(rig, plan.bigG ?? 6.6743e-11, inertia);
  const acceleration = (theta: number, speed: number, phiRad: number) => pull(phiRad - theta) - omega0Squared * theta - 2 * gamma * speed;
  const startRad = ((plan.anglesDeg[0] as number) * Math.PI) / 180;
  let theta = 0;
  for (let k = 0; k < 100; k += 1) theta = pull(startRad - theta) / omega0Squared;
  let speed = 0;
  const rate = plan.rateHz ?? 1;
  const perSample = Math.max(1, Math.ceil(0.5 / (rate * 0.25)));
  const h = 1 / (rate * 2 * perSample);
  const count = Math.floor(endS * rate);
  const utcMs = new Float64Array(count);
  const samples = new Float64Array(count);
  const radians = (tS: number) => (angleDegAt(tS) * Math.PI) / 180;
  for (let step = 0; step < count * 2 * perSample; step += 1) {
    const t = step * h;
    if (step % (2 * perSample) === perSample) {
      const k = (step - perSample) / (2 * perSample);
      utcMs[k] = nightStartUtcMs + t * 1000;
      samples[k] = theta;
    }
    const [p0, p1, p2] = [radians(t), radians(t + h / 2), radians(t + h)];
    const a1 = acceleration(theta, speed, p0);
    const a2 = acceleration(theta + (h / 2) * speed, speed + (h / 2) * a1, p1);
    const a3 = acceleration(theta + (h / 2) * (speed + (h / 2) * a1), speed + (h / 2) * a2, p1);
    const a4 = acceleration(theta + h * (speed + (h / 2) * a2), speed + h * a3, p2);
    theta += h * speed + ((h * h) / 6) * (a1 + a2 + a3);
    speed += (h / 6) * (a1 + 2 * a2 + 2 * a3 + a4);
  }
  return { utcMs, theta: samples };
}

/** near, far, near, … as turntable angles. */
export function alternatingAngles(dwells: number, nearDeg: number, farDeg: number): number[] {
  return Array.from({ length: dwells + 1 }, (_, k) => (k % 2 === 0 ? farDeg : nearDeg));
}
