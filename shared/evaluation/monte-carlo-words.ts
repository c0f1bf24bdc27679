import { formatFixed, UNIT_OF_G } from '../lib/format-number';
import { formatExact, formatUncertain, uncertainParts } from '../lib/format-uncertain';
import type { EvaluationResult } from './result';

/** What the trials found, in words: mean and standard deviation so far as there are any, and the 95 % interval. */
export function monteCarloWords({ monteCarlo, G }: Pick<EvaluationResult, 'monteCarlo' | 'G'>): string | null {
  if (monteCarlo === null) return null;
  const { trials, G_mean: mean, G_u: u, interval95 } = monteCarlo;
  const ends = monteCarlo.interval95_u ?? null;
  // Without a u of their own they have as many digits as u has.
  const end = (at: number, uOf: number | undefined) => {
    if (uOf !== undefined && uOf > 0) return formatUncertain({ value: at, u: uOf, unit: UNIT_OF_G });
    const { value, factor, unit } = uncertainParts({ value: at, u: u ?? G?.u ?? null, unit: UNIT_OF_G });
    return value + factor + unit;
  };
  const found = [
    ...(mean === null
      ? []
      : [u === null ? formatExact({ value: mean, unit: UNIT_OF_G }) : formatUncertain({ value: mean, u, unit: UNIT_OF_G })]),
    ...(u === null ? ['no standard deviation: an input has two degrees of freedom at most, or there was one trial'] : []),
    ...(interval95 === null ? [] : [`95 % interval from ${end(interval95[0], ends?.[0])} to ${end(interval95[1], ends?.[1])}`]),
  ];
  return `Monte Carlo (JCGM 101, ${formatFixed(trials, { decimals: 0 })} trials): ${found.join('; ')}.`;
}
