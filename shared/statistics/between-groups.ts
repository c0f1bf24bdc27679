import { weightedMean } from './weighted-mean';

/** Values with their standard uncertainties that may scatter more than those say: nights, or laboratories. */
interface Stated {
  value: number;
  u: number;
}

export interface Combined {
  /** Weighted by the stated u⁻² alone, with the u of these weights. */
  common: { mean: number; u: number };
  /** `common.u` times √(χ²/(k − 1)) where that is more than 1 (Birge 1932, from memory). */
  widenedU: number;
  /** Each value with a scatter of its own beside its u, as great as brings χ² to k − 1 (Paule and Mandel 1982, from memory); weighted by both. */
  own: Scattered;
}

interface Scattered {
  mean: number;
  u: number;
  /** Standard deviation between the values beside their u; 0 where these explain the scatter. */
  scatter: number;
  /** Its standard uncertainty, from the information that normal values would give (half of Σ w² about the variance); null for no scatter. */
  scatterU: number | null;
}

/** Both ways to combine values that may scatter more than they say; null for fewer than two, or where one has no u. */
export function combined(values: readonly Stated[]): Combined | null {
  if (values.length < 2 || values.some(({ u }) => !(u > 0))) return null;
  const { mean, u, birgeRatio } = weightedMean(values);
  return {
    common: { mean, u },
    widenedU: u * Math.max(1, birgeRatio ?? 1),
    own: withScatter(values, searched(values, momentVariance(values))),
  };
}

/** Variance between the values by moments, without a search (DerSimonian and Laird 1986, from memory). */
export function momentVariance(values: readonly Stated[]): number {
  const weights = values.map(({ u }) => u ** -2);
  const total = weights.reduce((sum, w) => sum + w, 0);
  const squares = weights.reduce((sum, w) => sum + w * w, 0);
  return Math.max(0, (weightedMean(values).chiSquared - values.length + 1) / (total - squares / total));
}

/** Mean of values that have a variance of their own beside their u. */
export function withScatter(values: readonly Stated[], variance: number): Scattered {
  const { mean, u } = weightedMean(values.map((one) => ({ value: one.value, u: Math.sqrt(one.u ** 2 + variance) })));
  const information = values.reduce((sum, one) => sum + (one.u ** 2 + variance) ** -2 / 2, 0);
  const scatter = Math.sqrt(variance);
  return { mean, u, scatter, scatterU: scatter === 0 ? null : 1 / (2 * scatter * Math.sqrt(information)) };
}

/** χ² falls with the variance added, ever more slowly: Newton's rule from below does not pass the root. */
function searched(values: readonly Stated[], start: number): number {
  const freedom = values.length - 1;
  const misfit = (variance: number) => {
    const weights = values.map(({ u }) => 1 / (u * u + variance));
    const total = weights.reduce((sum, w) => sum + w, 0);
    const mean = values.reduce((sum, { value }, i) => sum + (weights[i] as number) * value, 0) / total;
    const terms = values.map(({ value }, i) => (weights[i] as number) * (value - mean) ** 2);
    return {
      excess: terms.reduce((sum, term) => sum + term, 0) - freedom,
      slope: -terms.reduce((sum, term, i) => sum + term * (weights[i] as number), 0),
    };
  };
  let variance = misfit(start).excess >= 0 ? start : 0;
  for (let round = 0; round < 200; round += 1) {
    const { excess, slope } = misfit(variance);
    if (!(excess > 1e-12 * freedom) || slope === 0) break;
    variance -= excess / slope;
  }
  return variance;
}
