export interface WeightedMean {
  mean: number;
  /** Standard uncertainty from the given ones. */
  u: number;
  /** Σ (x − mean)² / u² */
  chiSquared: number;
  /** √(χ² / (n − 1)); null for a single value. */
  birgeRatio: number | null;
  /** Share of each value, summing to 1. */
  weights: number[];
}

/**
 * Mean weighted by u⁻². A value with u = 0 counts as exact and outweighs all others; several such are averaged.
 * @throws Error for an empty list.
 */
export function weightedMean(values: readonly { value: number; u: number }[]): WeightedMean {
  if (values.length === 0) throw new Error('a mean needs at least one value');
  const exact = values.filter(({ u }) => u === 0).length;
  const raw = values.map(({ u }) => (exact > 0 ? (u === 0 ? 1 : 0) : 1 / (u * u)));
  const total = raw.reduce((sum, w) => sum + w, 0);
  const weights = raw.map((w) => w / total);
  const mean = values.reduce((sum, { value }, i) => sum + (weights[i] as number) * value, 0);
  const chiSquared = values.reduce((sum, { value, u }) => sum + (u === 0 ? 0 : ((value - mean) / u) ** 2), 0);
  const birgeRatio = values.length > 1 ? Math.sqrt(chiSquared / (values.length - 1)) : null;
  return { mean, u: exact > 0 ? 0 : 1 / Math.sqrt(total), chiSquared, birgeRatio, weights };
}

/** Effective degrees of freedom of a sum of independent contributions (Welch–Satterthwaite, JCGM 100:2008, G.4); ν = ∞ is allowed. */
export function effectiveDegreesOfFreedom(contributions: readonly { contribution: number; nu: number }[]): number {
  const variance = contributions.reduce((sum, { contribution }) => sum + contribution ** 2, 0);
  const denominator = contributions.reduce((sum, { contribution, nu }) => sum + (nu === Infinity ? 0 : contribution ** 4 / nu), 0);
  return denominator === 0 ? Infinity : (variance * variance) / denominator;
}
