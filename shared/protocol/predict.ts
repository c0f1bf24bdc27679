import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { leverOf, spotM } from '../physics/lever';
import { type Oscillator, oscillatorOf } from '../physics/oscillator';
import { geometryOf, torqueGradientPerG, type TorqueGeometry } from '../physics/torque';
import { trapezoid } from '../physics/trapezoid';
import type { RigDocument } from '../rig/document';
import type { Timeline, TimelineItem } from './timeline';

export interface PredictedSignal {
  /** Near minus far equilibrium of the pendulum, rad. */
  signalRad: number;
  /** The same on the scale, m, with the sign of the lever; null without a lever. */
  signalM: number | null;
}

interface Pendulum {
  geometry: TorqueGeometry;
  oscillator: Oscillator;
}

export function pendulumOf(rig: RigDocument): Pendulum | null {
  const oscillator = oscillatorOf(rig);
  return oscillator === null ? null : { geometry: geometryOf(rig), oscillator };
}

/** NaN where the sources would pull harder than the fibre can hold, as at an angle inside a keep-out arc. */
function equilibriumAt({ geometry, oscillator }: Pendulum, angleDeg: number): number {
  try {
    return equilibriumRad({ geometry, kappa: oscillator.kappa, bigG: CODATA_2022_G.value, phiRad: angleDeg * RAD_PER_DEG });
  } catch {
    return Number.NaN;
  }
}

/**
 * Pendulum angle (rad) at which the pendulum comes to rest with the sources at the turntable angle (deg), with G of CODATA 2022; null
 * where the rig's period or decay time is not measured, or where there is no equilibrium.
 */
export function predictEquilibriumRad(rig: RigDocument, angleDeg: number): number | null {
  const pendulum = pendulumOf(rig);
  const restRad = pendulum === null ? Number.NaN : equilibriumAt(pendulum, angleDeg);
  return Number.isNaN(restRad) ? null : restRad;
}

/**
 * What one swing from far to near is worth, with G of CODATA 2022: exact torque at the exact equilibria. On the scale the angles count
 * from the middle of the two. Null without stations near and far, or without a measured period and decay time.
 */
export function predictSignal(rig: RigDocument): PredictedSignal | null {
  const pendulum = pendulumOf(rig);
  const near = rig.stations['near'];
  const far = rig.stations['far'];
  if (pendulum === null || near === undefined || far === undefined) return null;
  const nearRad = equilibriumAt(pendulum, near.value);
  const farRad = equilibriumAt(pendulum, far.value);
  if (Number.isNaN(nearRad - farRad)) return null;
  const middleRad = (nearRad + farRad) / 2;
  const lever = leverOf(rig);
  return {
    signalRad: nearRad - farRad,
    signalM: lever === null ? null : spotM(nearRad - middleRad, lever) - spotM(farRad - middleRad, lever),
  };
}

export interface PredictedDeflection {
  utcMs: number[];
  /** Pendulum angle, rad. */
  rad: number[];
  /** Where the pendulum would come to rest with the sources as they stand, rad. */
  equilibriumRad: number[];
}

/**
 * The pendulum's angle over a timeline at `points` evenly spaced instants: at rest at first, then the exact response of the linear
 * oscillator to each swing, with the frequency that the torque gradient gives it while the sources stand. Good for a strip, not for
 * an evaluation (the ringing is taken as small). Null where the rig's period or decay time is not measured, or where the sources go to an
 * angle at which the pendulum has no equilibrium.
 */
export function predictDeflection(
  rig: RigDocument,
  timeline: Pick<Timeline, 'items' | 'startUtcMs' | 'endUtcMs'>,
  points: number,
): PredictedDeflection | null {
  const pendulum = pendulumOf(rig);
  if (pendulum === null) return null;
  const segments = segmentsOf(pendulum, timeline);
  if (segments.some(({ restRad }) => Number.isNaN(restRad))) return null;
  const result: PredictedDeflection = { utcMs: [], rad: [], equilibriumRad: [] };
  let state = { x: 0, v: 0, restRad: segments[0]?.restRad ?? 0 };
  let index = 0;
  let sinceMs = timeline.startUtcMs;
  for (let point = 0; point < points; point += 1) {
    const atMs = timeline.startUtcMs + ((timeline.endUtcMs - timeline.startUtcMs) * point) / Math.max(1, points - 1);
    let segment = segments[index];
    while (segment !== undefined && segment.endUtcMs <= atMs && index < segments.length - 1) {
      state = carried(state, segment, {
        omega: segment.omega,
        gamma: pendulum.oscillator.gamma,
        seconds: (segment.endUtcMs - sinceMs) / 1000,
      });
      sinceMs = segment.endUtcMs;
      index += 1;
      segment = segments[index];
    }
    if (segment === undefined) break;
    const here = carried(state, segment, { omega: segment.omega, gamma: pendulum.oscillator.gamma, seconds: (atMs - sinceMs) / 1000 });
    result.utcMs.push(atMs);
    result.rad.push(here.restRad + here.x);
    result.equilibriumRad.push(segment.restRad);
  }
  return result;
}

interface State {
  /** Displacement from `restRad`, rad, and speed, rad/s. */
  x: number;
  v: number;
  restRad: number;
}

/** A stretch of time in which the sources count as standing still. */
interface Segment {
  endUtcMs: number;
  restRad: number;
  /** Damped angular frequency there, rad/s. */
  omega: number;
}

/** Free damped motion about the segment's own rest angle. */
function carried(from: State, { restRad }: Segment, { omega, gamma, seconds }: { omega: number; gamma: number; seconds: number }): State {
  const x = from.x + from.restRad - restRad;
  const decay = Math.exp(-gamma * seconds);
  const cos = Math.cos(omega * seconds);
  const sin = Math.sin(omega * seconds);
  const b = (from.v + gamma * x) / omega;
  return {
    restRad,
    x: decay * (x * cos + b * sin),
    v: decay * ((omega * b - gamma * x) * cos - (omega * x + gamma * b) * sin),
  };
}

/** Of a rotation no piece is longer, deg: the torque repeats after half a turn, with all its harmonics. */
const pieceDeg = 6;
const mostPieces = 6000;

/** Pieces of a move short against the period: a hundred to a period, at least 8, and on a way of more than a turn short against that. */
function piecesOf(durationS: number, periodS: number, wayDeg: number): number {
  const pieces = Math.min(200, Math.max(8, Math.ceil((100 * durationS) / periodS)));
  return wayDeg < 360 ? pieces : Math.min(mostPieces, Math.max(pieces, Math.ceil(wayDeg / pieceDeg)));
}

function segmentsOf(pendulum: Pendulum, { items, startUtcMs, endUtcMs }: Pick<Timeline, 'items' | 'startUtcMs' | 'endUtcMs'>): Segment[] {
  const standing = cached((angleDeg: number) => standingAt(pendulum, angleDeg));
  const segments: Segment[] = [];
  const add = (untilMs: number, angleDeg: number) => segments.push({ endUtcMs: untilMs, ...standing(angleDeg) });
  let angleDeg = items[0]?.angleFromDeg ?? 0;
  add(startUtcMs, angleDeg);
  for (const item of items) {
    if (item.angleFromDeg !== item.angleToDeg) addMove(item, pendulum.oscillator.periodS, add);
    else add(item.endUtcMs, item.angleToDeg);
    angleDeg = item.angleToDeg;
  }
  add(endUtcMs, angleDeg);
  return segments;
}

/** A move as pieces, each at the angle of its middle; homing has no known profile and counts as even. */
function addMove(item: TimelineItem, periodS: number, add: (untilMs: number, angleDeg: number) => void): void {
  const durationS = (item.endUtcMs - item.startUtcMs) / 1000;
  const pieces = piecesOf(durationS, periodS, Math.abs(item.angleToDeg - item.angleFromDeg));
  const move =
    item.speedDegS === undefined || item.accelerationDegS2 === undefined
      ? null
      : trapezoid({
          fromDeg: item.angleFromDeg,
          toDeg: item.angleToDeg,
          speedDegS: item.speedDegS,
          accelerationDegS2: item.accelerationDegS2,
        });
  for (let piece = 0; piece < pieces; piece += 1) {
    const fraction = (piece + 0.5) / pieces;
    const angleDeg = move?.angleDegAt(fraction * move.durationS) ?? item.angleFromDeg + fraction * (item.angleToDeg - item.angleFromDeg);
    add(item.startUtcMs + ((piece + 1) / pieces) * (item.endUtcMs - item.startUtcMs), angleDeg);
  }
}

export function standingAt(pendulum: Pendulum, angleDeg: number): { restRad: number; omega: number } {
  const { geometry, oscillator } = pendulum;
  const restRad = equilibriumAt(pendulum, angleDeg);
  const gradient = CODATA_2022_G.value * torqueGradientPerG(geometry, angleDeg * RAD_PER_DEG - restRad);
  const squared = oscillator.omegaD ** 2 + gradient / oscillator.inertiaKgM2;
  return { restRad, omega: Math.sqrt(Math.max(squared, oscillator.gamma ** 2)) };
}

function cached<T>(make: (key: number) => T): (key: number) => T {
  const kept = new Map<number, T>();
  return (key) => {
    const known = kept.get(key);
    if (known !== undefined) return known;
    const made = make(key);
    kept.set(key, made);
    return made;
  };
}
