import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import type { StepRow } from '@/shared/archive/run-records';
import type { RigDocument } from '@/shared/rig/document';
import { attraction } from './night-attraction';
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
  /** Swings in two moves: where the first one goes and how long from its start to that of the second, s. */
  shaped?: (fromDeg: number, toDeg: number) => { viaDeg: number; afterS: number };
  /** Instants at which the channel's clock shows what the rig's shows, s later. */
  channelLateS?: number;
  protocol?: BuildArchiveInput['protocol'];
}

export const nightStartUtcMs = Date.UTC(2026, 2, 1, 22, 0, 0);

interface Move {
  startS: number;
  durationS: number;
  fromDeg: number;
  toDeg: number;
  /** From its end to the next move, s. */
  restS: number;
  /** Whether a dwell follows, or the second move of a shaped swing. */
  dwells: boolean;
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
  const move = (fromDeg: number, toDeg: number, rest: (durationS: number) => { restS: number; dwells: boolean }): Move => {
    const distance = Math.abs(toDeg - fromDeg);
    const ramp = Math.min(limits.speed / limits.acceleration, Math.sqrt(distance / limits.acceleration));
    const durationS = distance === 0 ? 0 : ramp + distance / (limits.acceleration * ramp);
    const made = { startS: at, durationS, fromDeg, toDeg, ...rest(durationS) };
    at += durationS + made.restS;
    return made;
  };
  const dwell = () => ({ restS: plan.dwellS, dwells: true });
  return plan.anglesDeg.slice(1).flatMap((toDeg, k) => {
    const fromDeg = plan.anglesDeg[k] as number;
    if (plan.shaped === undefined) return [move(fromDeg, toDeg, dwell)];
    const { viaDeg, afterS } = plan.shaped(fromDeg, toDeg);
    const first = move(fromDeg, viaDeg, (durationS) => ({ restS: afterS - durationS, dwells: false }));
    return [first, move(viaDeg, toDeg, dwell)];
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
    steps: moves
      .flatMap((move, k) => rowsOf(move, plan, 2 * k + 1))
      .map((row, k) => ({ ...row, seq: k + 1, ...plan.row?.({ ...row, seq: k + 1 }) })),
    events: [],
    channels: [
      {
        info: { name: 'deflection', quantity: 'deflection', unit: plan.unit ?? 'rad', role: 'deflection' },
        utcMs: utcMs.map((ms) => ms + 1000 * (plan.channelLateS ?? 0)),
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
  return rows.slice(0, move.dwells ? 2 : 1);
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
  const rate = plan.rateHz ?? 0.5;
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
