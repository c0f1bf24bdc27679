import type { GaussianSource } from '../physics/seeded-gaussian';

/** Deviates of unit scale for the distributions that JCGM 101:2008, 6.4 assigns to what is known of a quantity. */

export type Law =
  | { kind: 'normal' }
  /** Student's t: a mean with its scatter from few repetitions. */
  | { kind: 't'; nu: number }
  /** Of unit standard deviation. */
  | { kind: 'rectangular' };

export function drawn(law: Law, source: GaussianSource): number {
  if (law.kind === 'rectangular') return Math.sqrt(3) * source.uniform();
  const z = source.next();
  return law.kind === 'normal' ? z : z * Math.sqrt(law.nu / (2 * gamma(law.nu / 2, source)));
}

/** Gamma distribution of unit scale (Marsaglia and Tsang 2000, from memory). */
function gamma(shape: number, source: GaussianSource): number {
  if (shape < 1) return gamma(shape + 1, source) * Math.exp(-source.wait() / shape);
  const d = shape - 1 / 3;
  const c = 1 / Math.sqrt(9 * d);
  for (;;) {
    const x = source.next();
    const v = (1 + c * x) ** 3;
    if (v > 0 && -source.wait() < 0.5 * x * x + d - d * v + d * Math.log(v)) return d * v;
  }
}
