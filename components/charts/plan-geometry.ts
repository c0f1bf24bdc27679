import type { RigDocument } from '@/shared/rig/document';
import { laneOf, type Lane } from './strip-model';

/**
 * The turntable from above in a square of side 2 whose middle is the axis; x to the right along the arm at rest, y
 * upwards, angles counter-clockwise. Pure.
 */

export interface PlanStation {
  name: string;
  lane: Lane;
  angleDeg: number;
}

export interface PlanLayout {
  /** Radius of the circle that the source centres keep to. */
  orbit: number;
  sourceRadius: number;
  /** Half length of the pendulum's arm and the radius of its balls. */
  arm: number;
  ballRadius: number;
  hasSources: boolean;
  /** Ticks for either source: each station and the same turned by half a turn. */
  ticks: PlanStation[];
  /** Arcs the sources may not enter, in deg, each also half a turn further on. */
  keepOut: [number, number][];
}

export function planLayout(rig: RigDocument): PlanLayout {
  const { sources, pendulum } = rig;
  const orbitM = sources.orbit?.value ?? pendulum.arm.value * 1.4;
  const radiusM = sources.radius?.value ?? orbitM * 0.2;
  // The outermost matter, or the ticks on the circle, just reach the edge of the square.
  const scale = 0.98 / (orbitM + Math.max(radiusM, orbitM * 0.07));
  const seen = new Map<string, PlanStation>();
  for (const [name, station] of Object.entries(rig.stations)) {
    for (const angleDeg of [station.value, station.value + 180]) {
      const key = ((Math.round(angleDeg * 10) / 10 + 720) % 360).toFixed(1);
      const lane = laneOf(name);
      const known = seen.get(key);
      if (!known || (known.lane === 'other' && lane !== 'other')) seen.set(key, { name, lane, angleDeg });
    }
  }
  return {
    orbit: orbitM * scale,
    sourceRadius: Math.max(0.06, radiusM * scale),
    arm: pendulum.arm.value * scale,
    ballRadius: Math.max(0.045, pendulum.ballRadius.value * scale),
    hasSources: sources.shape !== 'none',
    ticks: [...seen.values()],
    keepOut: (rig.motion?.keepOut ?? []).flatMap(
      ([from, to]) =>
        [
          [from, to],
          [from + 180, to + 180],
        ] as [number, number][],
    ),
  };
}

/** A point at a radius and an angle, in the square's units with y upwards. */
export function polar(radius: number, angleDeg: number): { x: number; y: number } {
  const rad = (angleDeg * Math.PI) / 180;
  return { x: radius * Math.cos(rad), y: radius * Math.sin(rad) };
}

/** Which named station the sources stand at, within half a degree; null between stations. */
export function stationNear(rig: RigDocument, angleDeg: number): string | null {
  const off = (a: number, b: number) => Math.abs(((((a - b) % 360) + 540) % 360) - 180);
  const found = Object.entries(rig.stations)
    .map(([name, { value }]) => ({ name, distance: off(value, angleDeg) }))
    .filter(({ distance }) => distance <= 0.5)
    .sort((a, b) => a.distance - b.distance)[0];
  return found?.name ?? null;
}
