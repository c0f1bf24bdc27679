import type { RigDocument } from '@/shared/rig/document';

/** Looking up a global costs much more under the test runner than using it. */
const { sqrt, sin, cos } = Math;

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

/** A body on the turntable as points: a sphere is one, a cylinder a product of midpoints in azimuth and Gauss–Legendre points in radius and height. */
function sourceOf({ sources }: RigDocument): { massKg: number; x: number; y: number; z: number }[] {
  const orbit = sources.orbit?.value ?? 1;
  const massKg = sources.shape === 'none' ? 0 : (sources.mass?.value ?? 0);
  const height = sources.offset?.value ?? 0;
  if (sources.shape !== 'cylinder') return [{ massKg, x: orbit, y: 0, z: height }];
  const [radius, length] = [sources.radius?.value ?? 0, sources.height?.value ?? 0];
  const azimuths = 48;
  const whole = gauss8.flatMap(([x, w]) => [-1, 1].map((side) => [(1 + side * x) / 2, w / 2] as const));
  const halves = whole.flatMap(([z, w]) => [0, 0.5].map((from) => [from + z / 2, w / 2] as const));
  return whole.flatMap(([r, wr]) =>
    halves.flatMap(([z, wz]) =>
      Array.from({ length: azimuths }, (_, k) => {
        const t = (2 * Math.PI * (k + 0.5)) / azimuths;
        return {
          massKg: (massKg * 2 * r * wr * wz) / azimuths,
          x: orbit + radius * r * cos(t),
          y: radius * r * sin(t),
          z: height + length * (z - 0.5),
        };
      }),
    ),
  );
}

/** Angular acceleration by the sources at ψ = turntable − pendulum (rad), rad/s2. */
export function attraction(rig: RigDocument, bigG: number, inertia: number): (psiRad: number) => number {
  const points = pointsOf(rig);
  const source = sourceOf(rig);
  const scale = bigG / inertia;
  const exact = (psiRad: number) => {
    const [c, s] = [cos(psiRad), sin(psiRad)];
    let torque = 0;
    for (const { massKg: sourceKg, x, y, z } of source) {
      const sx = x * c - y * s;
      const sy = x * s + y * c;
      const across = sy * sy + z * z;
      for (const { massKg, radiusM } of points) {
        const near = sqrt((sx - radiusM) * (sx - radiusM) + across);
        const far = sqrt((sx + radiusM) * (sx + radiusM) + across);
        torque += sourceKg * massKg * radiusM * sy * (1 / (near * near * near) - 1 / (far * far * far));
      }
    }
    return scale * torque;
  };
  if (source.length === 1) return exact;
  const turnsFreely = source.every(({ x, y }) => Math.hypot(x, y) > rig.pendulum.arm.value + 0.005);
  return interpolated(exact, turnsFreely ? [-0.1, Math.PI + 0.1] : [0.5, Math.PI - 0.5]);
}

/** Barycentric interpolation between Chebyshev points. */
function interpolated(exact: (psiRad: number) => number, [low, high]: [number, number]): (psiRad: number) => number {
  const count = 120;
  const nodes = Array.from({ length: count + 1 }, (_, k) => {
    const x = (low + high) / 2 + ((high - low) / 2) * cos((Math.PI * k) / count);
    return { x, y: exact(x), w: (k % 2 === 0 ? 1 : -1) * (k === 0 || k === count ? 0.5 : 1) };
  });
  return (psiRad) => {
    const turned = psiRad - Math.PI * Math.floor(psiRad / Math.PI);
    let [above, below] = [0, 0];
    for (const { x, y, w } of nodes) {
      if (turned === x) return y;
      const share = w / (turned - x);
      above += share * y;
      below += share;
    }
    return above / below;
  };
}
