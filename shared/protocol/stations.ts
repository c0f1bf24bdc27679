import type { RigDocument } from '../rig/document';
import type { SwingTarget } from './document';

export interface ResolvedTarget {
  /** Absolute turntable angle, deg. */
  targetDeg: number;
  /** Name of the station at that angle; empty where there is none. */
  station: string;
}

/** Two angles (deg) within a billionth of a degree are the same one: rounding of decimal numbers, no mechanics. */
const sameAngle = (a: number, b: number) => Math.abs(a - b) < 1e-9;

/** The first station of the rig that stands at the angle (deg); empty where there is none. */
export function stationAt(rig: RigDocument, angleDeg: number): string {
  return Object.keys(rig.stations).find((name) => sameAngle(rig.stations[name]?.value ?? Number.NaN, angleDeg)) ?? '';
}

/** Angle and station of a swing's target; null for a station that the rig does not have. */
export function resolveTarget(rig: RigDocument, to: SwingTarget): ResolvedTarget | null {
  if (typeof to !== 'string') return { targetDeg: to.angle_deg, station: stationAt(rig, to.angle_deg) };
  const station = Object.hasOwn(rig.stations, to) ? rig.stations[to] : undefined;
  return station === undefined ? null : { targetDeg: station.value, station: to };
}

/** Near or far: which side of the torque the angle (deg) is on, as the evaluation counts it: within 1 deg of the station, or of it turned by 180 deg. */
export function sideAt(rig: RigDocument, angleDeg: number): 'near' | 'far' | null {
  const isAt = (name: 'near' | 'far') => {
    const station = rig.stations[name];
    if (station === undefined) return false;
    const apart = Math.abs(angleDeg - station.value) % 180;
    return Math.min(apart, 180 - apart) <= 1;
  };
  if (isAt('near')) return 'near';
  return isAt('far') ? 'far' : null;
}
