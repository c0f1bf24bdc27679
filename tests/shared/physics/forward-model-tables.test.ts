import { CODATA_2022_G } from '@/shared/physics/constants';
import { cylinderPull } from '@/shared/physics/cylinder';
import { equilibriumRad } from '@/shared/physics/equilibrium';
import { fibreFacts } from '@/shared/physics/fibre';
import { leverOf, spotM, type Lever } from '@/shared/physics/lever';
import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import { standingAt } from '@/shared/physics/timed-moves';
import { geometryOf, torqueGradientPerG, torquePerG } from '@/shared/physics/torque';
import { strategyNights } from '@/shared/planning/strategies';
import { swingMove } from '@/shared/protocol/durations';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { gaussLegendre } from '@/shared/statistics/gauss-legendre';
import { relativeDifference } from '../../support/check-data';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** What is left of the tables A1 to A9 of physics.md: values of an independent implementation in double precision. */

const bigG = CODATA_2022_G.value;
const metres = (value: number) => ({ value, u: 0, unit: 'm' as const });
const points = (rig: RigDocument) => ({ ...geometryOf(rig), beamMassKg: 0 });
const rigs = {
  N: { rig: closeRig(), nearRad: closeSourceAngleRad, farRad: Math.PI - closeSourceAngleRad },
  W: { rig: wideRig(), nearRad: wideSourceAngleRad, farRad: -wideSourceAngleRad },
};

describe('the torque of spheres (A1, A3)', () => {
  // What the near pairs pull, and the share that the far ones take from it.
  test.each([
    ['N', 1.390479166667e-10, 0.02831008205318],
    ['W', 6.262132212949e-11, 0.02881148459566],
  ] as const)('on rig %s is that of the near pairs less the cross fraction', (name, near, cross) => {
    const { rig, nearRad } = rigs[name];
    const { armM: d, pairs } = geometryOf(rig);
    const R = pairs[0]?.orbitM ?? NaN;
    const square = (sign: 1 | -1) => d * d + R * R - sign * 2 * d * R * Math.cos(nearRad);
    expect(relativeDifference((square(1) / square(-1)) ** 1.5, cross)).toBeLessThan(1e-12);
    expect(relativeDifference((bigG * torquePerG(points(rig), nearRad)) / (1 - cross), near)).toBeLessThan(1e-11);
  });

  test.each([
    ['N', 0.001, 0.9993321154416],
    ['N', 0.005, 0.9835180982099],
    ['N', 0.01, 0.9366338846046],
    ['W', 0.005, 0.9895428100855],
  ] as const)('on rig %s with the sources %d m high is %d of that at one height', (name, heightM, ratio) => {
    const { rig, nearRad } = rigs[name];
    const raised = withRig(rig, (r) => (r.sources.offset = metres(heightM)));
    expect(relativeDifference(torquePerG(points(raised), nearRad) / torquePerG(points(rig), nearRad), ratio)).toBeLessThan(1e-11);
  });

  test.each([
    ['N', 45, -1.96759388387e-10],
    ['W', 90, -3.422017016919e-11],
  ] as const)('on rig %s changes at %d° as published', (name, angleDeg, gradient) => {
    const found = bigG * torqueGradientPerG(points(rigs[name].rig), (angleDeg * Math.PI) / 180);
    expect(relativeDifference(found, gradient)).toBeLessThan(1e-11);
  });
});

test.each([
  ['N', 0.002661626783953, 0.005369605153482],
  ['W', 0.001186922264269, 0.002373825686861],
] as const)(
  'on rig %s torque over κ misses the rest by the published amount; near minus far by the exact one (A4)',
  (name, linear, shift) => {
    const { rig, nearRad, farRad } = rigs[name];
    const geometry = geometryOf(rig);
    const { kappa } = oscillatorOf(rig) as Oscillator;
    const restAt = (phiRad: number) => equilibriumRad({ geometry, kappa, bigG, phiRad });
    expect(relativeDifference((bigG * torquePerG(geometry, nearRad)) / kappa, linear)).toBeLessThan(1e-11);
    expect(relativeDifference(restAt(nearRad) - restAt(farRad), shift)).toBeLessThan(1e-12);
  },
);

test('the spot of rig N goes 53.6966 mm, where small angles say 53.6961 mm (A5)', () => {
  const lever = leverOf(closeRig()) as Lever;
  const restRad = 0.005369605153482 / 2;
  expect(relativeDifference(spotM(restRad, lever) - spotM(-restRad, lever), 0.05369656760743)).toBeLessThan(1e-12);
  expect(relativeDifference(4 * lever.distanceM * restRad, 0.05369605153482)).toBeLessThan(1e-12);
});

test('a wire of 1 m is 8.3 times softer, and 25 µm bear 44 g 2.84 times at 2.5 GPa (A6, A7)', () => {
  const long = withRig(demoRigWide, (rig) => void (rig.fibre = { ...rig.fibre, length: metres(1) }));
  expect(relativeDifference(fibreFacts(long)?.kappa?.value ?? NaN, 6.17427267124e-9)).toBeLessThan(1e-11);
  expect(relativeDifference(2.5e9 / (fibreFacts(demoRigWide)?.stressPa ?? NaN), 2.844045599643)).toBeLessThan(1e-9);
});

describe('the damped pendulum of 420 s and Q 8 (A8)', () => {
  const oscillator = oscillatorOf(wideRig()) as Oscillator;
  const { omega0, omegaD, gamma, periodS, quality, kappa, inertiaKgM2 } = oscillator;
  const alone = standingAt({ geometry: { ...geometryOf(wideRig()), pairs: [] }, oscillator, bigG }, 0);

  test.each([
    ['undamped period, s', () => (2 * Math.PI) / omega0, 419.1788848451],
    ['damped by undamped period', () => (periodS * omega0) / (2 * Math.PI), 1.001958865736],
    ['decay time, s', () => 1 / gamma, 1067.430265006],
    ['the same by Q', () => (2 * quality) / omega0, 1067.430265006],
    ['logarithmic decrement', () => -2 * Math.log(alone.halfRatio), 0.3934683264745],
    ['half-period ratio', () => alone.halfRatio, 0.8214089649912],
    ['κ with ω_d² for ω₀²', () => (inertiaKgM2 * omegaD ** 2) / kappa - 1, -0.00390625],
  ])('has the published %s', (_name, value, published) => {
    expect(relativeDifference(value(), published)).toBeLessThan(1e-10);
  });

  test('is awaited for 4915.698 s until 1 % of its ringing is left', () => {
    const rig = withRig(demoRigWide, (r) => {
      r.measured = wideRig().measured;
      r.noise = { readout_rad: 5e-6 };
    });
    const [wait] = strategyNights(rig, { durationS: 12 * 3600, calibrations: [] }).filter(({ strategy }) => strategy === 'wait');
    const { cycleS, dwellS } = wait?.cadence ?? { cycleS: NaN, dwellS: NaN };
    const swingS = swingMove({ to: 'near' }, rig, rig.stations.far?.value as number).durationS;
    expect(cycleS - dwellS - swingS).toBeCloseTo(4915.698032025, 6);
  });
});

describe('the attraction of a cylinder (A9)', () => {
  const [a, l] = [0.03, 0.0525];
  const legendre = (count: number, from: number, to: number) =>
    gaussLegendre(count).map(([x, weight]): [number, number] => [from + (to - from) * x, weight * (to - from)]);

  /** Volume integral by brute force: points in radius, height and azimuth, towards the axis at the horizontal distance x, per distance. */
  function brute(x: number, aboveM: number, [inRadius, inAzimuth, inHeight]: readonly [number, number, number]): number {
    let sum = 0;
    for (const [r, ofRadius] of legendre(inRadius, 0, a)) {
      for (const [z, ofHeight] of legendre(inHeight, -l / 2, l / 2)) {
        for (let k = 0; k < inAzimuth; k += 1) {
          const t = (2 * Math.PI * (k + 0.5)) / inAzimuth;
          const [dx, dy, dz] = [x - r * Math.cos(t), r * Math.sin(t), aboveM - z];
          sum += (ofRadius * ofHeight * r * dx) / Math.hypot(dx, dy, dz) ** 3 / inAzimuth;
        }
      }
    }
    return (2 * sum) / (a * a * l) / x;
  }

  test.each([
    [[8, 16, 8], 2.912490380006e-8],
    [[16, 32, 16], 2.912501902601e-8],
    [[24, 48, 24], 2.912501902694e-8],
  ] as const)('by brute force with %p points is the published one', (counts, published) => {
    expect(relativeDifference(bigG * 1.6 * 0.06 * brute(0.06, 0, counts), published)).toBeLessThan(1e-11);
  });

  test.each([
    [0.06, 0],
    [0.06, 0.02],
    [0.05, 0.04],
    [0.15, 0.03],
  ])('is that of brute force %d m beside and %d m above its centre', (x, aboveM) => {
    const pull = cylinderPull({ radiusM: a, heightM: l, offsetM: aboveM })(x * x).value;
    expect(relativeDifference(pull, brute(x, aboveM, [24, 48, 24]))).toBeLessThan(1e-8);
  });

  test('falls along the axis as the closed form does: its lines of force neither begin nor end outside', () => {
    // Beside the axis the pull per distance is half of what the pull along the axis loses per length.
    const alongAxis = (fromM: number, toM: number) =>
      legendre(24, fromM, toM).reduce(
        (sum, [z, weight]) => sum + 2 * weight * cylinderPull({ radiusM: a, heightM: l, offsetM: z })(1e-10).value,
        0,
      );
    const lost = bigG * 1.6 * alongAxis(0.06, 0.2);
    expect(relativeDifference(lost, 2.864657453964e-8 - 2.669714568213e-9)).toBeLessThan(1e-6);
  });
});
