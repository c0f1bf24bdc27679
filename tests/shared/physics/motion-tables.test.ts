import { CODATA_2022_G } from '@/shared/physics/constants';
import { equilibriumRad } from '@/shared/physics/equilibrium';
import { oscillatorOf } from '@/shared/physics/oscillator';
import { Pendulum, type PendulumSetting } from '@/shared/physics/pendulum';
import { geometryOf, torqueGradientPerG, torquePerG } from '@/shared/physics/torque';
import { leastSquares } from '@/shared/statistics/least-squares';
import { relativeDifference } from '../../support/check-data';
import { wideRig, wideSourceAngleRad } from '../../support/reference-rigs';

/** What the pendulum of the wide rig does in time (physics.md B4 to B6, H3, I2): an independent implementation in double precision. */

const bigG = CODATA_2022_G.value;
const geometry = geometryOf(wideRig());
const free = oscillatorOf(wideRig()) as NonNullable<ReturnType<typeof oscillatorOf>>;
const { inertiaKgM2, kappa, gamma, omega0, omegaD, periodS } = free;
const setting: PendulumSetting = { geometry, oscillator: free, bigG };
const across = Math.PI / 2;

describe('the time of swing (B4)', () => {
  const undampedS = (phiRad: number) => (2 * Math.PI) / Math.sqrt((kappa + bigG * torqueGradientPerG(geometry, phiRad)) / inertiaKgM2);

  test('is shorter in line than across by the published amount, which gives G back', () => {
    expect(relativeDifference(undampedS(0), 417.9006235094)).toBeLessThan(1e-11);
    expect(relativeDifference(undampedS(across), 419.3220276538)).toBeLessThan(1e-11);
    const stiffer = (torqueGradientPerG(geometry, 0) - torqueGradientPerG(geometry, across)) / inertiaKgM2;
    expect(relativeDifference(stiffer, 22922.98486011)).toBeLessThan(1e-11);
  });

  // At a quarter of the published period an undamped pendulum passes its rest: off by φ of an amplitude, the period is off by 2φ/π of itself.
  test.each([
    [1e-3, 417.900629088],
    [1e-2, 417.901181167],
    [5e-2, 417.914433646],
  ])('grows with the amplitude: %d rad', (amplitudeRad, swingS) => {
    const undamped = { ...setting, oscillator: { ...free, gamma: 0, periodS: periodS / 20 } };
    const pendulum = new Pendulum(undamped, { angleRad: amplitudeRad, speedRadS: 0 });
    pendulum.advanceTo(swingS / 4, () => 0);
    expect(Math.abs(pendulum.angleRad / amplitudeRad)).toBeLessThan(2e-9);
    pendulum.advanceTo(swingS, () => 0);
    expect(relativeDifference(pendulum.angleRad, amplitudeRad)).toBeLessThan(1e-12);
  });
});

describe('the acceleration after a swing (B5)', () => {
  test('is the published one', () => {
    const stepNm = bigG * (torquePerG(geometry, wideSourceAngleRad) - torquePerG(geometry, -wideSourceAngleRad));
    expect(relativeDifference(stepNm / inertiaKgM2, 5.33351121785e-7)).toBeLessThan(1e-11);
    expect(relativeDifference(0.002373825686861 * omega0 ** 2, 5.3334688847e-7)).toBeLessThan(1e-10);
  });

  // 2001 readings of the answer to a unit step; the bias of ½ a₀ t² against a₀ = ω₀².
  test.each([
    { share: 0.05, single: -0.02108907632, square: -0.0191487359, quartic: 6.76806e-5 },
    { share: 0.1, single: -0.05731246649, square: -0.0513821475, quartic: 6.94387e-4 },
    { share: 0.2, single: -0.1682256887, square: -0.149900091, quartic: 7.61963e-3 },
  ])('is read falsely from the first $share of a period, by the published amounts', ({ share, single, square, quartic }) => {
    const places = Array.from({ length: 2001 }, (_, k) => k / 2000);
    const spanS = share * periodS;
    const answer = places.map((place) => {
      const t = place * spanS;
      return 1 - Math.exp(-gamma * t) * (Math.cos(omegaD * t) + (gamma / omegaD) * Math.sin(omegaD * t));
    });
    const scale = 2 / (spanS * omega0) ** 2;
    const bias = (powers: readonly number[]) => {
      const fit = leastSquares(
        powers.map((power) => places.map((place) => place ** power)),
        answer,
      );
      return scale * (fit.coefficients[powers.indexOf(2)] as number) - 1;
    };
    expect(relativeDifference(scale * (answer.at(-1) as number) - 1, single)).toBeLessThan(1e-9);
    expect(relativeDifference(bias([0, 2]), square)).toBeLessThan(1e-8);
    expect(relativeDifference(bias([0, 2, 3, 4]), quartic)).toBeLessThan(1e-5);
  });
});

describe('sources that turn at a constant rate (B6)', () => {
  const harmonic = (order: number) => {
    const places = Array.from({ length: 256 }, (_, k) => (2 * Math.PI * k) / 256);
    return places.reduce((sum, psi) => sum + (bigG * torquePerG(geometry, psi) * Math.sin(order * psi)) / 128, 0);
  };

  test('pull with the published harmonics, even ones alone', () => {
    expect(relativeDifference(harmonic(2), 4.53308180089e-11)).toBeLessThan(1e-10);
    expect(relativeDifference(harmonic(4), 2.38830717105e-11)).toBeLessThan(1e-10);
    expect(relativeDifference(harmonic(6), 1.06622262527e-11)).toBeLessThan(1e-10);
    expect(Math.abs(harmonic(3) / harmonic(2))).toBeLessThan(1e-12);
  });

  /** Gain κ|H| and phase of the pendulum's answer to each even harmonic, from a record of one turn; with so weak a pull the answer is linear. */
  function answers(turnS: number): (order: number) => { gain: number; phase: number } {
    const weak = 1e-5;
    const pendulum = new Pendulum({ ...setting, bigG: weak * bigG }, { angleRad: 0, speedRadS: 0 });
    const rate = (2 * Math.PI) / turnS;
    const times = Array.from({ length: 180 }, (_, k) => ((k + 1) * turnS) / 180);
    const record = times.map((atS) => {
      pendulum.advanceTo(atS, (s) => rate * s);
      return pendulum.angleRad;
    });
    const orders = Array.from({ length: 20 }, (_, k) => 2 * (k + 1));
    const of = (f: (x: number) => number, order: number) => times.map((atS) => f(order * rate * atS));
    const dying = (f: (x: number) => number) => times.map((atS) => Math.exp(-gamma * atS) * f(omegaD * atS));
    const { coefficients } = leastSquares(
      [...orders.flatMap((order) => [of(Math.sin, order), of(Math.cos, order)]), dying(Math.cos), dying(Math.sin)],
      record,
    );
    return (order) => {
      const [sine, cosine] = [coefficients[order - 2] as number, coefficients[order - 1] as number];
      return { gain: (kappa * Math.hypot(sine, cosine)) / (weak * harmonic(order)), phase: Math.atan2(cosine, sine) };
    };
  }
  const slow = answers(3600);

  test.each([
    { swingS: 1800, answer: () => slow(2), gain: 1.056841028377, phase: -0.03076912174996 },
    { swingS: 900, answer: () => slow(4), gain: 1.273505480342, phase: -0.07421068138744 },
    { swingS: 420, answer: () => answers(840)(2), gain: 8.011744562232, phase: -1.539495338649 },
  ])('are answered with the published gain and phase at $swingS s', ({ answer, gain, phase }) => {
    const found = answer();
    expect(relativeDifference(found.gain, gain)).toBeLessThan(1e-5);
    expect(Math.abs(found.phase - phase)).toBeLessThan(1e-5);
  });

  test('give a square near and far modulation of 1800 s the published fundamental', () => {
    const step = (bigG * torquePerG(geometry, wideSourceAngleRad)) / kappa;
    expect(relativeDifference((4 / Math.PI) * step * slow(2).gain, 0.00159713659241)).toBeLessThan(1e-5);
  });
});

test('how well a swing tells the clock: 2.72 ms with 5 µrad at 10 Hz, 3.04 ms from 900 s alone (H3)', () => {
  const restRad = equilibriumRad({ geometry, kappa, bigG, phiRad: wideSourceAngleRad });
  const pendulum = new Pendulum(setting, { angleRad: -restRad, speedRadS: 0 });
  let energy = 0;
  const uAt = (untilS: number) => {
    while (pendulum.atS < untilS) {
      pendulum.advanceTo(pendulum.atS + 1, () => wideSourceAngleRad);
      energy += pendulum.speedRadS ** 2;
    }
    return 5e-6 / Math.sqrt(10 * energy);
  };
  // The table's answer is linear; the exact one differs in the fifth digit.
  expect(relativeDifference(uAt(900), 0.00303634667)).toBeLessThan(1e-3);
  expect(relativeDifference(uAt(12_000), 0.0027202007)).toBeLessThan(1e-4);
});

test('a free pendulum is carried over 5 s by the published matrix (I2)', () => {
  const alone: PendulumSetting = { ...setting, geometry: { ...geometry, pairs: [] } };
  const after = (angleRad: number, speedRadS: number) => {
    const pendulum = new Pendulum(alone, { angleRad, speedRadS });
    pendulum.advanceTo(5, () => 0);
    return pendulum;
  };
  // Three steps of the fourth-order rule.
  expect(relativeDifference(after(1, 0).angleRad, 0.997201581611)).toBeLessThan(1e-8);
  expect(relativeDifference(after(0, 1).angleRad, 4.97199460917)).toBeLessThan(1e-8);
  expect(relativeDifference(after(1, 0).speedRadS, -0.00111709881183)).toBeLessThan(1e-8);
  expect(relativeDifference(after(0, 1).speedRadS, 0.987885760668)).toBeLessThan(1e-8);
});
