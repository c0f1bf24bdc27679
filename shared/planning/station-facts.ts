import { budgetInputs, derivativeStep } from '../evaluation/budget-inputs';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { geometryOf, torqueGradientPerG, torquePerG, type TorqueGeometry } from '../physics/torque';
import { pathObstacles } from '../protocol/motion-path';
import type { Quantity, RigDocument } from '../rig/document';

/** What the turntable angle does to the torque, and how the stations of a rig stand on that curve. Pure; the arm is at its rest line throughout. */

export interface CurvePoint {
  angleDeg: number;
  /** On the pendulum, with G of CODATA 2022. */
  torqueNm: number;
  /** `reached`: the masses may stand here; `kept out`: by limits or arcs; `touching`: a source would meet a ball. */
  state: 'reached' | 'kept out' | 'touching';
}

export interface StationFacts {
  name: string;
  angleDeg: number;
  uDeg: number;
  state: CurvePoint['state'];
  /** N m; u from the rig's geometry, this station's angle and G. */
  torque: { value: number; u: number };
  /** |torque| beside the greatest that can be reached, 0 to 1 (or above, where the station cannot be reached). */
  shareOfGreatest: number;
  /** Relative change of the torque for 0.1 deg more; null where there is hardly any torque to change. */
  perTenthDegree: number | null;
  /** Between the surfaces of a source and the ball next to it, m; null without sources. */
  gapM: number | null;
}

export interface StationsFacts {
  /** Over half a turn (after which the torque repeats), every degree, with near and far about the middle. */
  curve: CurvePoint[];
  /** The greatest positive torque where the masses may stand. */
  greatest: { angleDeg: number; torqueNm: number; perTenthDegree: number };
  stations: StationFacts[];
  /** Relative u of G by the angles of near and far alone, to second order; null without both. */
  angleRelativeU: number | null;
}

const HALF_TURN = 180;
const FINE_DEG = 0.25;
const FINEST_DEG = 0.001;
/** A torque below this share of the greatest is none: its relative change says nothing. */
const HARDLY_ANY = 1e-3;

/** Null where nothing on the turntable attracts, or the masses may stand nowhere. */
export function stationsFacts(rig: RigDocument): StationsFacts | null {
  const geometry = geometryOf(rig);
  if (geometry.pairs.length === 0) return null;
  const greatest = greatestTorque(rig, geometry);
  if (greatest === null) return null;
  const fromDeg = middleDeg(rig) - HALF_TURN / 2;
  const u = torqueUs(rig, geometry);
  return {
    curve: Array.from({ length: HALF_TURN + 1 }, (_, k) => {
      const angleDeg = fromDeg + k;
      return { angleDeg, torqueNm: torqueNm(geometry, angleDeg), state: stateAt(rig, angleDeg) };
    }),
    greatest,
    stations: Object.entries(rig.stations).map(([name, station]) => {
      const torque = torqueNm(geometry, station.value);
      const shareOfGreatest = Math.abs(torque / greatest.torqueNm);
      return {
        name,
        angleDeg: station.value,
        uDeg: station.u,
        state: stateAt(rig, station.value),
        torque: { value: torque, u: u(station) },
        shareOfGreatest,
        perTenthDegree: shareOfGreatest < HARDLY_ANY ? null : perTenthDegree(geometry, station.value),
        gapM: gapM(rig, station.value),
      };
    }),
    angleRelativeU: angleRelativeU(rig, geometry),
  };
}

const torqueNm = (geometry: TorqueGeometry, angleDeg: number) => CODATA_2022_G.value * torquePerG(geometry, angleDeg * RAD_PER_DEG);

const perTenthDegree = (geometry: TorqueGeometry, angleDeg: number) =>
  torqueNm(geometry, angleDeg + 0.1) / torqueNm(geometry, angleDeg) - 1;

/** Midway between near and far, whole degrees; 0 without them. */
function middleDeg({ stations: { near, far } }: RigDocument): number {
  return near === undefined || far === undefined ? 0 : Math.round((near.value + far.value) / 2);
}

/** Between a source and the nearer ball (m), surface to surface; negative where they would overlap. */
function gapM({ sources, pendulum }: RigDocument, angleDeg: number): number | null {
  const { orbit, radius, height, offset, shape } = sources;
  if (shape === 'none' || orbit === undefined || radius === undefined) return null;
  const product = 2 * pendulum.arm.value * orbit.value * Math.abs(Math.cos(angleDeg * RAD_PER_DEG));
  const acrossM = Math.sqrt(Math.max(0, pendulum.arm.value ** 2 + orbit.value ** 2 - product));
  const alongM = Math.abs(offset?.value ?? 0);
  if (shape === 'sphere') return Math.hypot(acrossM, alongM) - radius.value - pendulum.ballRadius.value;
  const outside = Math.hypot(Math.max(0, acrossM - radius.value), Math.max(0, alongM - (height?.value ?? 0) / 2));
  return outside - pendulum.ballRadius.value;
}

function stateAt(rig: RigDocument, angleDeg: number): CurvePoint['state'] {
  const gap = gapM(rig, angleDeg);
  if (gap !== null && gap <= 0) return 'touching';
  const { motion } = rig;
  if (motion === undefined) return 'reached';
  const turns = [-2, -1, 0, 1, 2].map((k) => angleDeg + k * HALF_TURN);
  return turns.some((deg) => pathObstacles(motion, deg, deg).length === 0) ? 'reached' : 'kept out';
}

function greatestTorque(rig: RigDocument, geometry: TorqueGeometry): StationsFacts['greatest'] | null {
  const best = (fromDeg: number, toDeg: number, stepDeg: number): number | null => {
    let found: { angleDeg: number; torque: number } | null = null;
    for (let k = 0; k * stepDeg <= toDeg - fromDeg; k += 1) {
      const angleDeg = fromDeg + k * stepDeg;
      const torque = torqueNm(geometry, angleDeg);
      if (torque > (found?.torque ?? 0) && stateAt(rig, angleDeg) === 'reached') found = { angleDeg, torque };
    }
    return found?.angleDeg ?? null;
  };
  const rough = best(middleDeg(rig) - HALF_TURN / 2, middleDeg(rig) + HALF_TURN / 2, FINE_DEG);
  const angleDeg = rough === null ? null : best(rough - FINE_DEG, rough + FINE_DEG, FINEST_DEG);
  if (angleDeg === null) return null;
  return { angleDeg, torqueNm: torqueNm(geometry, angleDeg), perTenthDegree: perTenthDegree(geometry, angleDeg) };
}

/** No part of the torque. */
const withoutTorque = new Set(['pendulum.ballRadius', 'pendulum.extraInertia']);

/** u of the torque at a station, N m: quantities of one group add before they are squared. */
function torqueUs(rig: RigDocument, geometry: TorqueGeometry): (station: Quantity) => number {
  const inputs = budgetInputs(rig, { stations: [], lever: false }).filter(
    ({ path, quantity }) => quantity.u > 0 && !withoutTorque.has(path),
  );
  const varied = inputs.map(({ path, quantity, shifted }) => {
    const step = derivativeStep(quantity);
    return {
      group: quantity.group ?? path,
      weight: quantity.u / (2 * step),
      more: geometryOf(shifted(step)),
      less: geometryOf(shifted(-step)),
    };
  });
  return (station) => {
    const byGroup = new Map<string, number>();
    const add = (group: string, contribution: number) => byGroup.set(group, (byGroup.get(group) ?? 0) + contribution);
    for (const { group, weight, more, less } of varied)
      add(group, weight * (torqueNm(more, station.value) - torqueNm(less, station.value)));
    const slope = CODATA_2022_G.value * torqueGradientPerG(geometry, station.value * RAD_PER_DEG) * RAD_PER_DEG;
    add(station.group ?? 'this station', slope * station.u);
    add('G', (CODATA_2022_G.u / CODATA_2022_G.value) * torqueNm(geometry, station.value));
    return Math.hypot(...byGroup.values());
  };
}

/** G goes with 1/(g_near − g_far): slopes count, and where they vanish the curvature does. */
function angleRelativeU({ stations: { near, far } }: RigDocument, geometry: TorqueGeometry): number | null {
  if (near === undefined || far === undefined) return null;
  const difference = torqueNm(geometry, near.value) - torqueNm(geometry, far.value);
  const terms = [near, far].flatMap((station) => {
    const at = (deg: number) => torqueNm(geometry, station.value + deg);
    const slope = (at(station.u) - at(-station.u)) / 2;
    const curvature = at(station.u) + at(-station.u) - 2 * at(0);
    // The variance of ½ g″ δ² is half of (g″ u²)².
    return [slope, curvature / Math.SQRT2];
  });
  return difference === 0 ? null : Math.hypot(...terms) / Math.abs(difference);
}
