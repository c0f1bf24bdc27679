import type { RigDocument } from '../rig/document';
import type { Cadence } from './night-noise';
import { predictU, togetherSource, type PredictedU } from './plan-uncertainty';
import { strategyNights, type StrategyNight } from './strategies';

/** What a planned night is expected to give, and what else could be done with its hours. */
export interface NightForecast {
  cadence: Cadence;
  predicted: PredictedU;
  /** Relative u of G that the wandering of the zero makes, in `predicted.statistics`. */
  wandering: number;
  /** Fewest pairs that bring u(G) within 5 % of what any number of them could come to; null where even many do not come so far. */
  enoughPairs: number | null;
  /** Best of each strategy in the hours of the plan. */
  strategies: StrategyNight[];
}

/** The rule: pairs are enough when u(G) is at most so many times what it would be after very many, without any noise of their dwells. */
const enough = 1.05;
const mostPairs = 1024;

/** Of a night of so many seconds at a cadence; null where the rig does not tell enough. */
export function forecastNight(rig: RigDocument, cadence: Cadence, durationS: number): NightForecast | null {
  const predicted = predictU(rig, cadence);
  if (predicted === null) return null;
  const still = predictU({ ...rig, noise: { ...rig.noise, walk_rad_per_sqrt_min: 0 } }, cadence);
  return {
    cadence,
    predicted,
    wandering: Math.sqrt(Math.max(0, predicted.statistics ** 2 - (still?.statistics ?? 0) ** 2)),
    enoughPairs: enoughPairs(rig, cadence),
    strategies: strategyNights(rig, { durationS, calibrations: cadence.calibrations }),
  };
}

function enoughPairs(rig: RigDocument, cadence: Cadence): number | null {
  const most = predictU(rig, { ...cadence, dwells: 2 * mostPairs });
  if (most === null) return null;
  const { relativeU, statistics, bySource } = most;
  const rest = Math.sqrt(Math.max(0, relativeU ** 2 - statistics ** 2 - (bySource[togetherSource] ?? 0) ** 2));
  return pairsToReach(rig, cadence, enough * rest);
}

/** Fewest pairs at the cadence's beat that bring the relative u of G down to `wanted`; null where no number of them does. */
export function pairsToReach(rig: RigDocument, cadence: Cadence, wanted: number): number | null {
  const does = (pairs: number) => (predictU(rig, { ...cadence, dwells: 2 * pairs })?.relativeU ?? Infinity) <= wanted;
  if (!does(mostPairs)) return null;
  let [few, many] = [0, 1];
  while (!does(many)) [few, many] = [many, 2 * many];
  while (many - few > 1) {
    const middle = Math.floor((few + many) / 2);
    if (does(middle)) many = middle;
    else few = middle;
  }
  return many;
}
