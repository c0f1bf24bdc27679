import { BOLTZMANN_J_K } from '@/shared/physics/constants';
import { oscillatorOf } from '@/shared/physics/oscillator';
import { createSimulatedBalance, type SimulatedBalanceOptions } from '@/shared/physics/simulated-balance';
import { trapezoid } from '@/shared/physics/trapezoid';
import type { RigDocument } from '@/shared/rig/document';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad, withRig } from '@/tests/support/reference-rigs';

const G = 6.6743e-11;
const DEG = 180 / Math.PI;
const still = (rig: RigDocument) => withRig(rig, (copy) => void (copy.noise = {}));
const noSources = (rig: RigDocument) => withRig(rig, (copy) => void (copy.sources = { shape: 'none' }));

function record(options: Partial<SimulatedBalanceOptions> & { rig: RigDocument }, forS: number, angleDegAt: (utcMs: number) => number) {
  const balance = createSimulatedBalance({ bigG: G, seed: 1, rateHz: 1, startUtcMs: 0, ...options });
  return balance.advance({ toUtcMs: forS * 1000, angleDegAt });
}

/** Nodes and weights of Gauss-Legendre quadrature on (−1, 1), from the roots of the Legendre polynomial by Newton's rule. */
const gauss = Array.from({ length: 16 }, (_, index) => {
  const n = 16;
  let x = Math.cos((Math.PI * (index + 0.75)) / (n + 0.5));
  let slope = 0;
  for (let round = 0; round < 20; round += 1) {
    let [p, before] = [1, 0];
    for (let k = 1; k <= n; k += 1) [p, before] = [((2 * k - 1) * x * p - (k - 1) * before) / k, p];
    slope = (n * (x * p - before)) / (x * x - 1);
    x -= p / slope;
  }
  return { place: x, weight: 2 / ((1 - x * x) * slope * slope) };
});

/** Sum over the four pairs of points and Gauss-Legendre quadrature over the beam: nothing of the product's torque code. */
function bruteTorqueNm(rig: RigDocument, psi: number): number {
  const [d, m, R, M] = [
    rig.pendulum.arm.value,
    rig.pendulum.ballMass.value,
    rig.sources.orbit?.value as number,
    rig.sources.mass?.value as number,
  ];
  const pull = (x: number, mass: number) => {
    let torque = 0;
    for (const turn of [0, Math.PI]) {
      const [sx, sy] = [R * Math.cos(psi + turn), R * Math.sin(psi + turn)];
      torque += (G * mass * M * x * sy) / ((sx - x) ** 2 + sy * sy) ** 1.5;
    }
    return torque;
  };
  let sum = pull(d, m) + pull(-d, m);
  const half = rig.pendulum.beamLength.value / 2;
  for (const { place, weight } of gauss) sum += pull(half * place, (rig.pendulum.beamMass.value * weight) / 2);
  return sum;
}

function denseIntegration(
  rig: RigDocument,
  angleDegAt: (utcMs: number) => number,
  { stepS: h, untilS, startRad }: { stepS: number; untilS: number; startRad: number },
) {
  const { kappa, inertiaKgM2, gamma } = oscillatorOf(rig) as NonNullable<ReturnType<typeof oscillatorOf>>;
  const turn = (t: number, x: number, v: number) =>
    (bruteTorqueNm(rig, angleDegAt(t * 1000) / DEG - x) - kappa * x) / inertiaKgM2 - 2 * gamma * v;
  const angles = [startRad];
  let [x, v] = [startRad, 0];
  for (let k = 0; k * h < untilS; k += 1) {
    const t = k * h;
    const k1 = turn(t, x, v);
    const k2 = turn(t + h / 2, x + (h / 2) * v, v + (h / 2) * k1);
    const k3 = turn(t + h / 2, x + (h / 2) * v + (h * h * k1) / 4, v + (h / 2) * k2);
    const k4 = turn(t + h, x + h * v + (h * h * k2) / 2, v + h * k3);
    x += h * v + ((h * h) / 6) * (k1 + k2 + k3);
    v += (h / 6) * (k1 + 2 * k2 + 2 * k3 + k4);
    angles.push(x);
  }
  return (t: number) => {
    const k = Math.min(angles.length - 3, Math.max(1, Math.floor(t / h)));
    const f = t / h - k;
    const [a, b, c, d] = [angles[k - 1] as number, angles[k] as number, angles[k + 1] as number, angles[k + 2] as number];
    return b + 0.5 * f * (c - a + f * (2 * a - 5 * b + 4 * c - d + f * (3 * (b - c) + d - a)));
  };
}

describe('without noise', () => {
  // Equilibria of the physics reference, A4, from an independent implementation.
  test.each([
    ['close', closeRig(), closeSourceAngleRad, 0.002684802576741],
    ['wide', wideRig(), wideSourceAngleRad, 0.001186912843431],
  ])('rests at the equilibrium of the %s rig and goes over to the mirrored one', (_name, rig, angleRad, equilibrium) => {
    const nearDeg = angleRad * DEG;
    const atNear = record({ rig: still(rig), startDeg: nearDeg }, 100, () => nearDeg);
    for (const value of atNear.value) expect(value).toBeCloseTo(equilibrium, 14);
    // 25 decay times: what is left of the swing is 1e-11 of it.
    const farDeg = rig.stations['far']?.value as number;
    const toFar = record({ rig: still(rig), startDeg: nearDeg, rateHz: 0.1 }, 25 * 1067.43, () => farDeg);
    expect((toFar.value.at(-1) as number) / -equilibrium).toBeCloseTo(1, 9);
  });

  test('decays as a damped oscillator: half-period ratio 0.8214 at Q 8, period 420 s', () => {
    // Physics reference, A8: K = 0.8214089649912.
    const angleRad = 1e-3;
    const { value } = record({ rig: still(noSources(wideRig())), initial: { angleRad, speedRadS: 0 }, rateHz: 1 }, 2000, () => 0);
    const { omegaD, gamma } = oscillatorOf(wideRig()) as NonNullable<ReturnType<typeof oscillatorOf>>;
    value.forEach((theta, index) => {
      const t = index + 0.5;
      const awaited = angleRad * Math.exp(-gamma * t) * (Math.cos(omegaD * t) + (gamma / omegaD) * Math.sin(omegaD * t));
      // 1e-8 of the amplitude.
      expect(Math.abs(theta - awaited)).toBeLessThan(1e-11);
    });
    // Sampled once a second, the turning point is met to 3e-5.
    const turningPoint = Math.min(...value.slice(0, 400));
    expect(-turningPoint / angleRad).toBeCloseTo(0.8214089649912, 4);
  });

  test('swings more slowly about the near equilibrium of the close rig: 421.842 s', () => {
    // Physics reference, A4: damped period 421.842303267 s with the sources near.
    const nearDeg = closeSourceAngleRad * DEG;
    const offset = 1e-7;
    const { value, utcMs } = record(
      { rig: still(closeRig()), initial: { angleRad: 0.002684802576741 + offset, speedRadS: 0 } },
      1800,
      () => nearDeg,
    );
    const crossings: number[] = [];
    for (let index = 1; index < value.length; index += 1) {
      const [a, b] = [(value[index - 1] as number) - 0.002684802576741, (value[index] as number) - 0.002684802576741];
      if (a > 0 && b <= 0) crossings.push(((utcMs[index - 1] as number) + (1000 * a) / (a - b)) / 1000);
    }
    expect((crossings[2] as number) - (crossings[1] as number)).toBeCloseTo(421.842303267, 2);
  });

  describe('follows a swing of the sources as a dense independent integration does', () => {
    const rig = still(wideRig());
    const nearDeg = wideSourceAngleRad * DEG;
    const shiftRad = 0.002373825686861;
    const move = trapezoid({ fromDeg: nearDeg, toDeg: -nearDeg, speedDegS: 6, accelerationDegS2: 2 });
    const angleDegAt = (utcMs: number) => move.angleDegAt(utcMs / 1000 - 101.37);
    const dense = denseIntegration(rig, angleDegAt, { stepS: 0.05, untilS: 900, startRad: shiftRad / 2 });

    test.each([
      [10, 1e-8],
      [1, 1e-8],
      [1 / 30, 1e-7],
    ])('at %f Hz to %f of the shift', (rateHz, tolerance) => {
      const { utcMs, value } = record({ rig, startDeg: nearDeg, rateHz }, 900, angleDegAt);
      value.forEach((theta, index) => expect(Math.abs(theta - dense((utcMs[index] as number) / 1000))).toBeLessThan(tolerance * shiftRad));
    });
  });
});

describe('noise', () => {
  const bare = noSources(wideRig());
  const noisy = (noise: RigDocument['noise']) => withRig(bare, (copy) => void (copy.noise = noise));
  const rms = (values: ArrayLike<number>) => Math.sqrt(Array.from(values).reduce((sum, x) => sum + x * x, 0) / values.length);

  test('readout noise is white with the standard deviation of the rig', () => {
    const { value } = record({ rig: noisy({ readout_rad: 5e-6 }), rateHz: 10 }, 4000, () => 0);
    // 40,000 independent samples: the scatter of the estimate is 0.35 %.
    expect(rms(value) / 5e-6).toBeGreaterThan(0.985);
    expect(rms(value) / 5e-6).toBeLessThan(1.015);
    const lag = value.slice(1).reduce((sum, x, index) => sum + x * (value[index] as number), 0) / value.length / 25e-12;
    expect(Math.abs(lag)).toBeLessThan(0.02);
  });

  test('the walk spreads as the root of time, the drift is a line', () => {
    const ends = Array.from(
      { length: 300 },
      (_, seed) =>
        record({ rig: noisy({ walk_rad_per_sqrt_min: 1e-6 }), seed: seed + 1, rateHz: 0.1 }, 3600, () => 0).value.at(-1) as number,
    );
    // √60 µrad after an hour; 300 walks give it to 4 %.
    expect(rms(ends) / (1e-6 * Math.sqrt(60))).toBeGreaterThan(0.85);
    expect(rms(ends) / (1e-6 * Math.sqrt(60))).toBeLessThan(1.15);
    const { value, utcMs } = record({ rig: noisy({ drift_rad_per_h: 3e-5 }), rateHz: 0.1 }, 7200, () => 0);
    value.forEach((x, index) => expect(x).toBeCloseTo((3e-5 * (utcMs[index] as number)) / 3.6e6, 15));
  });

  test('thermal noise has the rms angle of equipartition', () => {
    // Physics reference, I1: √(kT/κ) = 2.796159705943e-07 rad at 295.15 K. 4e6 s hold about 3,700 correlation times: 2 %.
    const { value } = record({ rig: noisy({ temperature_K: 295.15 }), rateHz: 0.2 }, 4e6, () => 0);
    const { kappa } = oscillatorOf(bare) as NonNullable<ReturnType<typeof oscillatorOf>>;
    expect(Math.sqrt((BOLTZMANN_J_K * 295.15) / kappa)).toBeCloseTo(2.796159705943e-7, 15);
    expect(rms(value) / 2.796159705943e-7).toBeGreaterThan(0.94);
    expect(rms(value) / 2.796159705943e-7).toBeLessThan(1.06);
    // And of its means over 900 s: 4.48746475e-8 rad; 4,444 of them tell it to 1 %.
    const means = Array.from({ length: Math.floor(value.length / 180) }, (_, k) => value.slice(180 * k, 180 * (k + 1)));
    const scatter = rms(means.map((part) => part.reduce((sum, x) => sum + x, 0) / 180));
    expect(scatter / 4.48746475e-8).toBeGreaterThan(0.95);
    expect(scatter / 4.48746475e-8).toBeLessThan(1.05);
  });

  test('bursts come as often as asked and are as long as asked', () => {
    const { value } = record({ rig: noisy({ bursts_per_h: 2, burst_rad: 2e-4, burst_s: 20 }), rateHz: 10 }, 20 * 3600, () => 0);
    const loud = Array.from({ length: 20 * 60 }, (_, minute) => Math.max(...value.slice(minute * 600, minute * 600 + 600)) > 1e-4);
    const bursts = loud.filter((is, minute) => is && !loud[minute - 1]).length;
    // Poisson with mean 40: within three standard deviations.
    expect(bursts).toBeGreaterThan(21);
    expect(bursts).toBeLessThan(59);
  });

  test('leaving out one term leaves the others as they were', () => {
    const both = record({ rig: noisy({ readout_rad: 5e-6, drift_rad_per_h: 1e-5, walk_rad_per_sqrt_min: 1e-6 }) }, 100, () => 0).value;
    const readout = record({ rig: noisy({ readout_rad: 5e-6 }) }, 100, () => 0).value;
    const rest = record({ rig: noisy({ drift_rad_per_h: 1e-5, walk_rad_per_sqrt_min: 1e-6 }) }, 100, () => 0).value;
    both.forEach((x, index) => expect(x).toBeCloseTo((readout[index] as number) + (rest[index] as number), 15));
  });
});

describe('sampling', () => {
  const rig = withRig(wideRig(), (copy) => void (copy.noise = { readout_rad: 5e-6, walk_rad_per_sqrt_min: 1e-6, temperature_K: 295 }));
  const angleDegAt = (utcMs: number) => (utcMs < 30_000 ? 20 : -20);

  test('samples are stamped at mid-exposure', () => {
    expect(Array.from(record({ rig, rateHz: 10, startUtcMs: 946_684_800_000 }, 946_684_800.35, angleDegAt).utcMs)).toEqual([
      946_684_800_050, 946_684_800_150, 946_684_800_250,
    ]);
  });

  test('the same seed gives the same record, however it is cut into batches; another seed another', () => {
    const whole = record({ rig, rateHz: 4 }, 60, angleDegAt);
    const balance = createSimulatedBalance({ rig, bigG: G, seed: 1, rateHz: 4, startUtcMs: 0 });
    const pieces = [0.1, 7.3, 7.31, 29.9, 30.4, 60].map((toS) => balance.advance({ toUtcMs: toS * 1000, angleDegAt }));
    expect(pieces.flatMap(({ value }) => Array.from(value))).toEqual(Array.from(whole.value));
    expect(pieces.flatMap(({ utcMs }) => Array.from(utcMs))).toEqual(Array.from(whole.utcMs));
    expect(Array.from(record({ rig, rateHz: 4, seed: 2 }, 60, angleDegAt).value)).not.toEqual(Array.from(whole.value));
  });

  test('a rig without period and decay time is refused in words', () => {
    const bare = withRig(wideRig(), (copy) => void delete copy.measured);
    expect(() => createSimulatedBalance({ rig: bare, bigG: G, seed: 1, rateHz: 1, startUtcMs: 0 })).toThrow(
      'measured.period_s and measured.decayTime_s',
    );
  });
});
