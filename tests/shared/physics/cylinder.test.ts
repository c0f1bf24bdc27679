import { CODATA_2022_G } from '@/shared/physics/constants';
import { cylinderPull } from '@/shared/physics/cylinder';
import { geometryOf, torqueGradientPerG, torquePerG } from '@/shared/physics/torque';
import { relativeDifference } from '../../support/check-data';
import { closeRig, closeSourceAngleRad, withRig } from '../../support/reference-rigs';

/** Expected values: physics.md A9, by product quadrature of 24 × 48 × 24 points in another program. */

const G = CODATA_2022_G.value;
const a = 0.03;
const metres = (value: number) => ({ value, u: 0, unit: 'm' as const });

const ofBeam = (beamKg: number, radiusM: number, heightM: number) =>
  withRig(closeRig(), (r) => {
    r.sources = { ...r.sources, shape: 'cylinder', radius: metres(radiusM), height: metres(heightM) };
    r.pendulum.beamMass.value = beamKg;
  });

test('a cylinder of 1.6 kg pulls at two radii in its middle plane as tabulated', () => {
  const pull = cylinderPull({ radiusM: a, heightM: 0.0525, offsetM: 0 })(0.06 ** 2);
  expect(relativeDifference(G * 1.6 * 0.06 * pull.value, 2.912501902694e-8)).toBeLessThan(1e-12);
});

test.each([
  [a, 1.062476411211],
  [Math.sqrt(3) * a, 0.9839770305775],
  [2 * a, 0.9516926064308],
])('a height of %d m pulls %d times as a point does', (heightM, ratio) => {
  const pull = cylinderPull({ radiusM: a, heightM, offsetM: 0 })(0.06 ** 2);
  expect(relativeDifference(pull.value * 0.06 ** 3, ratio)).toBeLessThan(1e-12);
});

test.each([0.025, 0.0302, 0.0306, 0.045, 0.2, 3])('the slope at a distance of %d m is that of the pull', (rho) => {
  const pull = cylinderPull({ radiusM: a, heightM: 0.02, offsetM: 0.013 });
  const step = 1e-4 * rho * rho;
  const difference = (pull(rho * rho + step).value - pull(rho * rho - step).value) / (2 * step);
  expect(relativeDifference(pull(rho * rho).slope, difference)).toBeLessThan(1e-4);
});

test('the torque of the close rig with cylinders is 0.9587 of that with spheres', () => {
  const torque = G * torquePerG(geometryOf(ofBeam(0, a, 0.0525)), closeSourceAngleRad);
  expect(relativeDifference(torque, 1.295268046987e-10)).toBeLessThan(1e-9);
  const spheres = G * torquePerG({ ...geometryOf(closeRig()), beamMassKg: 0 }, closeSourceAngleRad);
  expect(relativeDifference(torque / spheres, 0.9586663182382)).toBeLessThan(1e-9);
});

test('a grain pulls balls and beam as a sphere does', () => {
  const [grain, sphere] = [geometryOf(ofBeam(0.004, 1e-6, 1e-6)), geometryOf(closeRig())];
  for (const psi of [0.57, 0.8, 1.5, 2.4, -0.6]) {
    expect(relativeDifference(torquePerG(grain, psi), torquePerG(sphere, psi))).toBeLessThan(1e-9);
    expect(relativeDifference(torqueGradientPerG(grain, psi), torqueGradientPerG(sphere, psi))).toBeLessThan(1e-7);
  }
});

test('a cylinder without its measures is refused', () => {
  const rig = withRig(closeRig(), (r) => (r.sources.shape = 'cylinder'));
  expect(() => geometryOf(rig)).toThrow('sources.radius and sources.height are needed for cylinders');
});
