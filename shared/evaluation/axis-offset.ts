import { RAD_PER_DEG } from '../physics/constants';
import { geometryOf, type TorqueGeometry } from '../physics/torque';
import type { RigDocument } from '../rig/document';

/**
 * A turntable axis that stands beside the fibre moves one source closer and the other away. To first order in the offset
 * this cancels between the two; what is left goes with its square and depends on the direction, which is not known.
 */

const directions = 24;
const beamPieces = 40;

/** Torque over G, kg2/m, with the turntable axis at `axis` (m, from the fibre); the beam in pieces. */
function torqueBeside(geometry: TorqueGeometry, psiRad: number, axis: { x: number; y: number }): number {
  let torque = 0;
  for (const { massKg, radiusM } of pointsOf(geometry)) {
    for (const pair of geometry.pairs) {
      for (const turned of [0, Math.PI]) {
        const angle = psiRad + pair.angleRad + turned;
        const x = axis.x + pair.orbitM * Math.cos(angle) - radiusM;
        const y = axis.y + pair.orbitM * Math.sin(angle);
        const pull = pair.cylinder?.pull(x * x + y * y).value ?? Math.hypot(x, y, pair.offsetM) ** -3;
        torque += massKg * pair.massKg * radiusM * y * pull;
      }
    }
  }
  return torque;
}

function pointsOf({ armM, ballMassKg, beamMassKg, beamHalfLengthM }: TorqueGeometry): { massKg: number; radiusM: number }[] {
  const beam = Array.from({ length: beamPieces }, (_, k) => ({
    massKg: beamMassKg / beamPieces,
    radiusM: beamHalfLengthM * ((2 * k + 1) / beamPieces - 1),
  }));
  return [{ massKg: ballMassKg, radiusM: armM }, { massKg: ballMassKg, radiusM: -armM }, ...beam];
}

/**
 * Root mean square, over all directions of the offset, of the relative change of near-minus-far torque for an axis
 * `offsetM` beside the fibre.
 */
function relativeTorqueChange(geometry: TorqueGeometry, stations: { nearRad: number; farRad: number }, offsetM: number): number {
  const differenceAt = (axis: { x: number; y: number }) =>
    torqueBeside(geometry, stations.nearRad, axis) - torqueBeside(geometry, stations.farRad, axis);
  const centred = differenceAt({ x: 0, y: 0 });
  let squares = 0;
  for (let k = 0; k < directions; k += 1) {
    const direction = (2 * Math.PI * k) / directions;
    const change = differenceAt({ x: offsetM * Math.cos(direction), y: offsetM * Math.sin(direction) }) / centred - 1;
    squares += change * change;
  }
  return Math.sqrt(squares / directions);
}

/** The rig's stated offset with what it does to G; null where none is stated, or near or far is not. */
export function axisOffsetOf(rig: RigDocument): { value: number; u: number; relative: number } | null {
  const offset = rig.axis?.offset;
  const near = rig.stations.near?.value;
  const far = rig.stations.far?.value;
  if (offset === undefined || near === undefined || far === undefined) return null;
  const stations = { nearRad: near * RAD_PER_DEG, farRad: far * RAD_PER_DEG };
  return {
    value: offset.value,
    u: offset.u,
    relative: relativeTorqueChange(geometryOf(rig), stations, Math.hypot(offset.value, offset.u)),
  };
}
