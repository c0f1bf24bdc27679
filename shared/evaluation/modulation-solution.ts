import type { PendulumSetting } from '../physics/pendulum';
import { steadyRotation } from '../physics/steady-rotation';
import { fittedHarmonics } from './rotation-fit';

/** G from the harmonics of a rotation: their size tells G, their phase how far the two clocks are apart. */

export interface ObservedHarmonics {
  /** a₁, b₁, a₂, … rad. */
  harmonics: ArrayLike<number>;
  speedRadS: number;
  /** By which it counts. */
  turns: number;
}

/** The pendulum between the sources without a G. */
export type RotatingPendulum = Omit<PendulumSetting, 'bigG'>;

/** The harmonics that the exact torque and the transfer function give. @throws Error at a resonance without damping */
export function expectedHarmonics(pendulum: RotatingPendulum, bigG: number, speedRadS: number): Float64Array {
  const { cosine, sine } = steadyRotation({ ...pendulum, bigG }, speedRadS);
  return Float64Array.from({ length: 2 * fittedHarmonics }, (_, i) => (i % 2 === 0 ? cosine : sine)[i >> 1] as number);
}

export interface HarmonicsModel {
  expected: Float64Array;
  /** By G, and by the channel's lateness in s. */
  byG: Float64Array;
  byLateness: Float64Array;
}

/** The harmonics as a channel shows them whose clock is late by so many seconds, and how they answer to G and lateness. */
export function harmonicsModel(pendulum: RotatingPendulum, at: { bigG: number; latenessS: number; speedRadS: number }): HarmonicsModel {
  const { bigG, latenessS, speedRadS } = at;
  const step = 1e-4 * Math.abs(bigG);
  const seen = (ownG: number) => late(expectedHarmonics(pendulum, ownG, speedRadS), latenessS * speedRadS);
  const [expected, more, less] = [seen(bigG), seen(bigG + step), seen(bigG - step)];
  const order = (i: number) => 2 * ((i >> 1) + 1);
  return {
    expected,
    byG: expected.map((_, i) => ((more[i] as number) - (less[i] as number)) / (2 * step)),
    byLateness: expected.map((_, i) => order(i) * speedRadS * (i % 2 === 0 ? -(expected[i + 1] as number) : (expected[i - 1] as number))),
  };
}

/** The harmonics of θ(φ − shift), as harmonics of φ. */
function late(harmonics: Float64Array, shiftRad: number): Float64Array {
  return harmonics.map((value, i) => {
    const angle = 2 * ((i >> 1) + 1) * shiftRad;
    const [cos, sin] = [Math.cos(angle), Math.sin(angle)];
    return i % 2 === 0 ? value * cos - (harmonics[i + 1] as number) * sin : value * cos + (harmonics[i - 1] as number) * sin;
  });
}

export interface ModulationSolution {
  bigG: number;
  latenessS: number;
}

const mostSteps = 40;

/** Least squares over all harmonics of all rotations. */
export function solveModulation(observed: readonly ObservedHarmonics[], pendulum: RotatingPendulum, startG: number): ModulationSolution {
  let solution: ModulationSolution = { bigG: startG, latenessS: 0 };
  for (let count = 0; count < mostSteps; count += 1) {
    const models = observed.map(({ speedRadS }) => harmonicsModel(pendulum, { ...solution, speedRadS }));
    const { bigG, latenessS } = gaussStep(observed, models);
    solution = { bigG: solution.bigG + bigG, latenessS: solution.latenessS + latenessS };
    if (Math.abs(bigG) <= 1e-13 * Math.abs(solution.bigG)) break;
  }
  return solution;
}

/** What the observed harmonics leave of the expected ones, as changes of G and lateness. */
export function gaussStep(observed: readonly ObservedHarmonics[], models: readonly HarmonicsModel[]): ModulationSolution {
  let [gg, gl, ll, g, l] = [0, 0, 0, 0, 0];
  observed.forEach(({ harmonics, turns }, k) => {
    const { expected, byG, byLateness } = models[k] as HarmonicsModel;
    for (let i = 0; i < expected.length; i += 1) {
      const [dg, dl] = [byG[i] as number, byLateness[i] as number];
      const rest = (harmonics[i] as number) - (expected[i] as number);
      gg += turns * dg * dg;
      gl += turns * dg * dl;
      ll += turns * dl * dl;
      g += turns * dg * rest;
      l += turns * dl * rest;
    }
  });
  const determinant = gg * ll - gl * gl;
  return { bigG: (g * ll - l * gl) / determinant, latenessS: (l * gg - g * gl) / determinant };
}
