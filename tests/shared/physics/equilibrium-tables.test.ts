import { CODATA_2022_G } from '@/shared/physics/constants';
import { equilibriumRad } from '@/shared/physics/equilibrium';
import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import { geometryOf, torqueGradientPerG, torquePerG } from '@/shared/physics/torque';
import { relativeDifference } from '../../support/check-data';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad } from '../../support/reference-rigs';

/** What a false period or a zero off the line of symmetry does to G (physics.md B2, B3): values of an independent implementation. */

const bigG = CODATA_2022_G.value;
const rigs = {
  close: { rig: closeRig(), nearRad: closeSourceAngleRad, farRad: Math.PI - closeSourceAngleRad },
  wide: { rig: wideRig(), nearRad: wideSourceAngleRad, farRad: -wideSourceAngleRad },
};

function standing({ rig, nearRad, farRad }: (typeof rigs)[keyof typeof rigs], restRad = 0) {
  const geometry = geometryOf(rig);
  const { kappa, inertiaKgM2 } = oscillatorOf(rig) as Oscillator;
  const at = (phiRad: number) => equilibriumRad({ geometry, kappa, bigG, phiRad, restRad });
  return { geometry, kappa, inertiaKgM2, nearRad, farRad, theta: { near: at(nearRad), far: at(farRad) } };
}

describe('the period of the dwells, which the sources stiffen', () => {
  test.each([
    ['close', -0.008681441114488],
    ['wide', 1.589377166566e-5],
  ] as const)('taken for the free one on the %s rig makes G wrong by the published amount', (name, published) => {
    const { geometry, kappa, nearRad, farRad, theta } = standing(rigs[name]);
    const stiffness = kappa + bigG * torqueGradientPerG(geometry, nearRad - theta.near);
    const found =
      (stiffness * (theta.near - theta.far)) / (torquePerG(geometry, nearRad - theta.near) - torquePerG(geometry, farRad - theta.far));
    expect(relativeDifference(found / bigG - 1, published)).toBeLessThan(1e-8);
  });

  test('gives G back by the closed form I ω₀² θ / [g(φ − θ) + θ g′(φ − θ)]', () => {
    const { geometry, kappa, inertiaKgM2, nearRad, theta } = standing(rigs.close);
    const psi = nearRad - theta.near;
    const omega0Squared = (kappa + bigG * torqueGradientPerG(geometry, psi)) / inertiaKgM2;
    const found = (inertiaKgM2 * omega0Squared * theta.near) / (torquePerG(geometry, psi) + theta.near * torqueGradientPerG(geometry, psi));
    expect(relativeDifference(found, bigG)).toBeLessThan(1e-13);
  });
});

test.each([
  [0.001, 7.044495536457e-6],
  [0.01, 0.0007046603017271],
  [0.03, 0.006357287811539],
])('a zero %d rad off the line of symmetry changes near minus far by the published share', (restRad, published) => {
  const differenceAt = (rest: number) => {
    const { theta } = standing(rigs.close, rest);
    return theta.near - theta.far;
  };
  expect(Math.abs(differenceAt(restRad) / differenceAt(0) - 1 - published)).toBeLessThan(1e-11);
});
