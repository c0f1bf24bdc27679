import { RAD_PER_DEG } from './constants';
import { equilibriumRad } from './equilibrium';
import { Pendulum, type PendulumSetting } from './pendulum';
import { torqueGradientPerG, torquePerG } from './torque';
import { trapezoid } from './trapezoid';

/** The pendulum under moves of the sources at given times: what the plans of shaped swings and kicks are made of and checked with. */

/** How fast the sources turn: deg/s and deg/s2. */
export interface Slew {
  speedDegS: number;
  accelerationDegS2: number;
}

/** A straight move that begins `startS` after the first one. */
export interface TimedMove {
  startS: number;
  fromDeg: number;
  toDeg: number;
  durationS: number;
}

/** The pendulum with the sources standing at an angle. */
export interface Standing {
  /** Where it comes to rest, rad. */
  restRad: number;
  /** Damped angular frequency there, rad/s. */
  omega: number;
  /** Half a damped period there, s. */
  halfPeriodS: number;
  /** What half a period leaves of an amplitude: e^(−πζ/√(1−ζ²)). */
  halfRatio: number;
}

/**
 * The pendulum beside sources that stand at the turntable angle (deg): κ_eff = κ + G g'(φ − θ).
 * @throws Error where it has no stable equilibrium or does not swing
 */
export function standingAt({ geometry, oscillator, bigG }: PendulumSetting, angleDeg: number): Standing {
  const phiRad = angleDeg * RAD_PER_DEG;
  const { kappa, inertiaKgM2, gamma } = oscillator;
  const restRad = equilibriumRad({ geometry, kappa, bigG, phiRad });
  const squared = (kappa + bigG * torqueGradientPerG(geometry, phiRad - restRad)) / inertiaKgM2 - gamma * gamma;
  if (!(squared > 0)) throw new Error(`the pendulum does not swing with the sources at ${angleDeg.toFixed(2)} deg`);
  const omega = Math.sqrt(squared);
  return { restRad, omega, halfPeriodS: Math.PI / omega, halfRatio: Math.exp((-gamma * Math.PI) / omega) };
}

const centroidPieces = 200;

/**
 * When the torque changes in the middle of a move, s after its start: t_c = ∫ t dτ / Δτ with the pendulum on its rest line; half the
 * move's length where the torque is the same at both ends.
 */
export function torqueCentroidS({ geometry }: PendulumSetting, slew: Slew, { fromDeg, toDeg }: { fromDeg: number; toDeg: number }): number {
  const move = trapezoid({ fromDeg, toDeg, ...slew });
  const torqueAt = (tS: number) => torquePerG(geometry, move.angleDegAt(tS) * RAD_PER_DEG);
  const first = torqueAt(0);
  const change = torqueAt(move.durationS) - first;
  if (Math.abs(change) <= 1e-12 * Math.abs(first)) return move.durationS / 2;
  const stepS = move.durationS / centroidPieces;
  let area = 0;
  for (let piece = 0; piece < centroidPieces; piece += 1) area += (torqueAt((piece + 0.5) * stepS) - first) * stepS;
  return move.durationS - area / change;
}

/** The turntable angle (deg) between two others at which the pendulum rests at `restRad`, which lies between its rests at the two. */
export function angleOfRest(setting: PendulumSetting, between: { fromDeg: number; toDeg: number }, restRad: number): number {
  const offAt = (angleDeg: number) => standingAt(setting, angleDeg).restRad - restRad;
  let [low, high] = [between.fromDeg, between.toDeg];
  const rising = offAt(high) > offAt(low);
  for (let halving = 0; halving < 60; halving += 1) {
    const middle = (low + high) / 2;
    if (offAt(middle) > 0 === rising) high = middle;
    else low = middle;
  }
  return (low + high) / 2;
}

/** How the pendulum is left by moves. */
export interface LeftMotion {
  /** Angle from the rest at the last target, rad, and speed, rad/s, when the last move ends. */
  offRad: number;
  speedRadS: number;
  /** Amplitude of the ringing about that rest, rad, carried back to the middle of the last move. */
  amplitudeRad: number;
}

/** What moves leave of a pendulum that rests at their beginning, by the exact equation of motion. */
export function motionAfter(setting: PendulumSetting, slew: Slew, moves: readonly TimedMove[]): LeftMotion {
  const first = moves[0];
  const last = moves.at(-1);
  if (first === undefined || last === undefined) return { offRad: 0, speedRadS: 0, amplitudeRad: 0 };
  const start = standingAt(setting, first.fromDeg);
  const end = standingAt(setting, last.toDeg);
  const pendulum = new Pendulum(setting, { angleRad: start.restRad, speedRadS: 0 });
  let standsDeg = first.fromDeg;
  for (const move of moves) {
    const standsRad = standsDeg * RAD_PER_DEG;
    if (move.startS > pendulum.atS) pendulum.advanceTo(move.startS, () => standsRad);
    const { angleDegAt } = trapezoid({ ...move, ...slew });
    if (move.durationS > 0) pendulum.advanceTo(move.startS + move.durationS, (atS) => angleDegAt(atS - move.startS) * RAD_PER_DEG);
    standsDeg = move.toDeg;
  }
  const { gamma } = setting.oscillator;
  const offRad = pendulum.angleRad - end.restRad;
  const { speedRadS } = pendulum;
  const amplitudeRad = Math.hypot(offRad, (speedRadS + gamma * offRad) / end.omega) * Math.exp((gamma * last.durationS) / 2);
  return { offRad, speedRadS, amplitudeRad };
}

/** The moves from target to target whose torque centroids are `pausesS` apart. */
export function movesByCentroid(
  setting: PendulumSetting,
  slew: Slew,
  { anglesDeg, pausesS }: { anglesDeg: readonly number[]; pausesS: readonly number[] },
): TimedMove[] {
  let centroidAtS = 0;
  return anglesDeg.slice(1).map((toDeg, index) => {
    const fromDeg = anglesDeg[index] ?? toDeg;
    const { durationS } = trapezoid({ fromDeg, toDeg, ...slew });
    const centroidS = torqueCentroidS(setting, slew, { fromDeg, toDeg });
    centroidAtS = index === 0 ? centroidS : centroidAtS + (pausesS[index - 1] ?? 0);
    return { startS: index === 0 ? 0 : centroidAtS - centroidS, fromDeg, toDeg, durationS };
  });
}

/** Whether each move has ended before the next begins. */
export function areApart(moves: readonly TimedMove[]): boolean {
  return moves.every(
    ({ startS }, index) => index === 0 || startS >= (moves[index - 1] as TimedMove).startS + (moves[index - 1] as TimedMove).durationS,
  );
}
