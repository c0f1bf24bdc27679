import { CODATA_2022_G } from '@/shared/physics/constants';
import { equilibriumRad } from '@/shared/physics/equilibrium';
import { angleRadOfSpot, leverOf, spotM } from '@/shared/physics/lever';
import { inertiaKgM2, oscillatorOf } from '@/shared/physics/oscillator';
import { geometryOf, torqueGradientPerG } from '@/shared/physics/torque';
import { trapezoid } from '@/shared/physics/trapezoid';
import { relativeDifference } from '../../support/check-data';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

/** Check values of this file: an independent implementation in double precision, given to 12 digits. */
const bigG = CODATA_2022_G.value;
const rigs = {
  N: { rig: closeRig(), phiRad: closeSourceAngleRad },
  W: { rig: wideRig(), phiRad: wideSourceAngleRad },
};

function oscillatorOfRig(rig: ReturnType<typeof wideRig>) {
  const found = oscillatorOf(rig);
  if (found === null) throw new Error('the reference rig has a measured period');
  return found;
}

describe('the oscillator of the reference rigs', () => {
  const found = oscillatorOfRig(rigs.W.rig);

  test('has the published inertia, frequencies and torsion constant', () => {
    expect(relativeDifference(inertiaKgM2(rigs.W.rig), 0.000231975)).toBeLessThan(1e-12);
    expect(relativeDifference(found.omegaD, 0.01495996501709)).toBeLessThan(1e-12);
    expect(relativeDifference(found.omega0, 0.01498926957998)).toBeLessThan(1e-12);
    expect(relativeDifference(found.gamma, 0.0009368293487488)).toBeLessThan(1e-12);
    expect(relativeDifference(found.kappa, 5.211972603453e-8)).toBeLessThan(1e-12);
    expect(relativeDifference(found.quality, 8)).toBeLessThan(1e-9);
  });

  test('is unknown without a measured period and decay time', () => {
    expect(oscillatorOf(withRig(wideRig(), (r) => delete r.measured))).toBeNull();
  });

  test('carries the extra inertia', () => {
    const heavier = withRig(wideRig(), (r) => (r.pendulum.extraInertia = { value: 1e-5, u: 0, unit: 'kg.m2' }));
    expect(inertiaKgM2(heavier) - inertiaKgM2(wideRig())).toBeCloseTo(1e-5, 15);
  });
});

describe('the equilibrium', () => {
  test.each([
    { name: 'N', theta: 0.002684802576741, stiffness: 5.166725170206e-8, periodS: 421.842303267 },
    { name: 'W', theta: 0.001186912843431, stiffness: 5.212055441356e-8, periodS: 419.9966492591 },
  ] as const)('of rig $name has the published angle, stiffness and period', ({ name, theta, stiffness, periodS }) => {
    const { rig, phiRad } = rigs[name];
    const geometry = geometryOf(rig);
    const { kappa, gamma, inertiaKgM2: inertia } = oscillatorOfRig(rig);
    const found = equilibriumRad({ geometry, kappa, bigG, phiRad });
    expect(relativeDifference(found, theta)).toBeLessThan(1e-12);
    const kappaAtAngle = kappa + bigG * torqueGradientPerG(geometry, phiRad - found);
    expect(relativeDifference(kappaAtAngle, stiffness)).toBeLessThan(1e-12);
    expect(relativeDifference((2 * Math.PI) / Math.sqrt(kappaAtAngle / inertia - gamma * gamma), periodS)).toBeLessThan(1e-11);
  });

  test('moves along with the rest line of the fibre', () => {
    const { rig, phiRad } = rigs.W;
    const input = { geometry: geometryOf(rig), kappa: oscillatorOfRig(rig).kappa, bigG, phiRad };
    expect(equilibriumRad({ ...input, restRad: 0.01 })).toBeCloseTo(0.01 + equilibriumRad({ ...input, phiRad: phiRad - 0.01 }), 14);
  });

  test('is refused where the sources pull harder than the fibre', () => {
    const { rig } = rigs.N;
    expect(() => equilibriumRad({ geometry: geometryOf(rig), kappa: 1e-12, bigG, phiRad: 1 })).toThrow('no stable equilibrium');
  });
});

describe('the optical lever', () => {
  const lever = leverOf(wideRig());
  if (lever === null) throw new Error('the reference rig has a lever');

  test('reads the tangent of twice the angle', () => {
    expect(relativeDifference(spotM(0.01, lever), 0.100013335467012)).toBeLessThan(1e-12);
    expect(relativeDifference(spotM(0.03, lever) - spotM(0.02, lever), 0.100253784178914)).toBeLessThan(1e-12);
    expect(relativeDifference(angleRadOfSpot(0.1, lever), 0.009998666986575267)).toBeLessThan(1e-12);
  });

  test('goes back and forth with a reversed scale and a shifted zero', () => {
    const reversed = { ...lever, sense: -1 as const, zeroM: 0.031 };
    expect(spotM(0.01, reversed)).toBeLessThan(0.031);
    expect(angleRadOfSpot(spotM(0.0123, reversed), reversed)).toBeCloseTo(0.0123, 15);
  });

  test('is absent from a rig that reads angles', () => {
    expect(leverOf(withRig(wideRig(), (r) => delete r.lever))).toBeNull();
  });
});

describe('a trapezoidal move', () => {
  test.each([
    { distance: 114.76151385761, speed: 6, acceleration: 2, durationS: 22.12691897627, peak: 6 },
    { distance: 40.361656773404, speed: 6, acceleration: 2, durationS: 9.726942795567, peak: 6 },
    { distance: 10, speed: 6, acceleration: 2, durationS: 4.472135955, peak: 4.4721359549996 },
    { distance: 18, speed: 6, acceleration: 2, durationS: 6, peak: 6 },
    { distance: 90, speed: 10, acceleration: 5, durationS: 11, peak: 10 },
  ])('over $distance deg takes the published time', ({ distance, speed, acceleration, durationS, peak }) => {
    const move = trapezoid({ fromDeg: 20, toDeg: 20 - distance, speedDegS: speed, accelerationDegS2: acceleration });
    expect(relativeDifference(move.durationS, durationS)).toBeLessThan(1e-9);
    expect(relativeDifference(move.peakSpeedDegS, peak)).toBeLessThan(1e-9);
    expect(move.angleDegAt(-1)).toBe(20);
    expect(move.angleDegAt(move.durationS / 2)).toBeCloseTo(20 - distance / 2, 9);
    expect(move.angleDegAt(move.durationS)).toBe(20 - distance);
    expect(move.angleDegAt(move.durationS + 100)).toBe(20 - distance);
  });

  test('of no distance takes no time', () => {
    const move = trapezoid({ fromDeg: 5, toDeg: 5, speedDegS: 6, accelerationDegS2: 2 });
    expect(move.durationS).toBe(0);
    expect(move.angleDegAt(1)).toBe(5);
  });

  test('never exceeds the speed and the acceleration asked for', () => {
    const move = trapezoid({ fromDeg: -20, toDeg: 20.3, speedDegS: 6, accelerationDegS2: 2 });
    const step = 0.01;
    for (let t = -1; t < move.durationS + 1; t += step) {
      const speed = (move.angleDegAt(t + step) - move.angleDegAt(t)) / step;
      const next = (move.angleDegAt(t + 2 * step) - move.angleDegAt(t + step)) / step;
      expect(Math.abs(speed)).toBeLessThanOrEqual(6 + 1e-9);
      expect(Math.abs(next - speed) / step).toBeLessThanOrEqual(2 + 1e-6);
    }
  });
});
